# The examples of docs/commands.md are what the commands print (messages first; rounding noise masked, long
# numbers cut, since their last digits belong to the tolerance).
source=$PWD
ln -s "$source/networks" "$source/tests" "$SCRATCH"
cd "$SCRATCH"
mkdir build
mask() { sed -E 's/[0-9]+ starts, [0-9]+ conv/# starts, # conv/; s/(Closed to|balanced to|path to) [0-9]+([.][0-9]+)?(e-?[0-9]+)?/\1 #/g; s/(\.[0-9]{6})[0-9]+/\1/g'; }
run_example() {
    COLUMNS=80 eval "limbeck $1" >out 2>err </dev/null
    mask <err >shown
    mask <out >>shown
    mask <wanted | diff -u - shown || echo "docs/commands.md: $1"
}
command= is_example=
while IFS= read -r line; do
    case $line in
    '$ limbeck '*) command=${line#\$ limbeck } is_example=yes; : >wanted ;;
    '```') if [ -n "$is_example" ]; then run_example "$command"; fi; is_example= ;;
    *) if [ -n "$is_example" ]; then printf '%s\n' "$line" >>wanted; fi ;;
    esac
done <"$source/docs/commands.md"
echo done
