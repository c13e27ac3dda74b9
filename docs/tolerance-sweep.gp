# The data:  LB_TEST_LONG=1 LB_SWEEP_DATA=docs/tolerance-sweep.dat build/tests/run sweep   (appends: start without it)
# The plot:  gnuplot docs/tolerance-sweep.gp   (both from the folder of the project)
set terminal svg size 760,520 font "sans-serif,13" background "white"
set output "docs/tolerance-sweep.svg"
set logscale xy
set format xy "10^{%T}"
set xrange [2e-3:5e-13]
set yrange [1e-14:1e-1]
set xlabel "relative tolerance"
set ylabel "relative error of the worst species at the end"
set key outside right
set grid
problems = "ROBER HIRES OREGO POLLU decay Brusselator Lotka enzyme"
plot for [i=0:7] "docs/tolerance-sweep.dat" using (strcol(1) eq word(problems, i+1) ? $2 : NaN):3 with linespoints pt i+4 ps 0.7 lw 1.5 title word(problems, i+1), \
     x with lines dashtype 2 lc rgb "black" title "error = tolerance"
