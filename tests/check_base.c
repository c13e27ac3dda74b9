/* Memory, arenas, buffers and error records. */
#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "base/memory.h"
#include "base/status.h"
#include "support.h"

START_TEST(test_allocation_fails_exactly_when_told)
{
    memory_fail_after(1);
    void *first = memory_alloc(8);
    void *second = memory_zeroed(2, 8);
    memory_fail_after(-1);
    ck_assert_ptr_nonnull(first);
    ck_assert_ptr_null(second);
    memory_free(first);
}
END_TEST

START_TEST(test_overflowing_sizes_are_refused)
{
    ck_assert_ptr_null(memory_array(SIZE_MAX / 2, 3));
    void *block = memory_alloc(4);
    ck_assert_ptr_null(memory_resize(block, SIZE_MAX / 2, 3));
    memory_free(block);
}
END_TEST

START_TEST(test_growing_array_keeps_its_elements)
{
    int *list = NULL;
    size_t capacity = 0;
    for (size_t i = 0; i < 1000; i++) {
        ck_assert_int_eq(memory_grow(&list, &capacity, i, sizeof *list), 0);
        list[i] = (int)i;
    }
    for (int i = 0; i < 1000; i++)
        ck_assert_int_eq(list[i], i);
    memory_free(list);
}
END_TEST

START_TEST(test_arena_blocks_are_zeroed_aligned_and_apart)
{
    arena *a = arena_new();
    unsigned char *last = NULL;
    for (size_t size = 1; size < 100000; size = size * 3 + 1) {
        unsigned char *block = arena_alloc(a, size);
        ck_assert_ptr_nonnull(block);
        ck_assert_uint_eq((uintptr_t)block % _Alignof(max_align_t), 0);
        for (size_t i = 0; i < size; i++)
            ck_assert_uint_eq(block[i], 0);
        memset(block, 0xff, size);
        ck_assert_ptr_ne(block, last);
        last = block;
    }
    ck_assert_str_eq(arena_text_n(a, "limbeck", 4), "limb");
    arena_free(a);
}
END_TEST

START_TEST(test_buffer_collects_text_of_any_length)
{
    buffer b;
    buffer_init(&b);
    for (int i = 0; i < 1000; i++)
        buffer_printf(&b, "%d,", i);
    ck_assert_int_eq(buffer_status(&b), LB_OK);
    ck_assert_uint_eq(strlen(buffer_get(&b)), b.length);
    ck_assert_uint_eq(b.length, 10 * 2 + 90 * 3 + 900 * 4);
    buffer_clear(&b);
    ck_assert_str_eq(buffer_get(&b), "");
}
END_TEST

START_TEST(test_buffer_failure_sticks_until_it_is_asked)
{
    buffer b;
    buffer_init(&b);
    buffer_append(&b, "kept");
    memory_fail_after(0);
    buffer_repeat(&b, '-', 10000);
    memory_fail_after(-1);
    buffer_append(&b, "not appended");
    ck_assert_int_eq(buffer_status(&b), LB_E_NOMEM);
    ck_assert_ptr_null(strstr(buffer_get(&b), "not appended"));
    ck_assert_ptr_null(buffer_take(&b));
}
END_TEST

START_TEST(test_error_record_carries_code_message_and_remedy)
{
    lb_error err;
    ck_assert_int_eq(status_raise(&err, LB_E_ARG, "write 1", "%d is odd", 3), LB_E_ARG);
    ck_assert_int_eq(err.code, LB_E_ARG);
    ck_assert_str_eq(err.message, "3 is odd");
    ck_assert_str_eq(err.remedy, "write 1");
    ck_assert_int_eq(status_raise(NULL, LB_E_IO, NULL, "unheard"), LB_E_IO);
}
END_TEST

START_TEST(test_every_status_has_its_own_text)
{
    for (int a = LB_OK; a <= LB_E_STOPPED; a++)
        for (int b = LB_OK; b < a; b++)
            ck_assert_str_ne(lb_status_text((lb_status)a), lb_status_text((lb_status)b));
}
END_TEST

Suite *base_suite(void)
{
    Suite *suite = suite_create("base");
    TCase *memory = tcase_create("memory");
    tcase_add_test(memory, test_allocation_fails_exactly_when_told);
    tcase_add_test(memory, test_overflowing_sizes_are_refused);
    tcase_add_test(memory, test_growing_array_keeps_its_elements);
    tcase_add_test(memory, test_arena_blocks_are_zeroed_aligned_and_apart);
    suite_add_tcase(suite, memory);
    TCase *text = tcase_create("text");
    tcase_add_test(text, test_buffer_collects_text_of_any_length);
    tcase_add_test(text, test_buffer_failure_sticks_until_it_is_asked);
    tcase_add_test(text, test_error_record_carries_code_message_and_remedy);
    tcase_add_test(text, test_every_status_has_its_own_text);
    suite_add_tcase(suite, text);
    return suite;
}
