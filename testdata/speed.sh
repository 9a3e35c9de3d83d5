#!/bin/sh
# How fast the simulator is, as ratios: processor time of a live replicate-year
# (pulse), sub-step (flow) and event, of the simulator, of the same kernel on
# gonum's samplers, and of the plain simulator; medians of so many rounds, all in
# one run. Then one worker against two, by the clock, which wants an idle machine.
#
#     sh testdata/speed.sh [ROUNDS]
set -eu
cd "$(dirname "$0")/.."
rounds=${1:-6}
out=$(mktemp)
trap 'rm -f "$out"' EXIT
go test ./pva/year -run '^$' -bench 'Year/' -benchtime 0.5s -cpu 1 -count "$rounds" >"$out"
go test ./pva/year -run '^$' -bench 'Workers' -benchtime 1s -cpu 2 -count "$rounds" >>"$out"
awk '
function median(key,    n, i, j, v, a) {
	n = count[key]
	for (i = 1; i <= n; i++) a[i] = value[key, i]
	for (i = 2; i <= n; i++) { v = a[i]; for (j = i - 1; j > 0 && a[j] > v; j--) a[j + 1] = a[j]; a[j + 1] = v }
	return n % 2 ? a[(n + 1) / 2] : (a[n / 2] + a[n / 2 + 1]) / 2
}
function keep(key, v) { value[key, ++count[key]] = v }
/^BenchmarkYear\// { split($1, part, "/"); sub(/-[0-9]+$/, "", part[3]); for (i = 2; i <= NF; i++) if ($i == "cpu-ns/unit") keep(part[2] " " part[3], $(i - 1)) }
/^BenchmarkWorkers\// { split($1, part, "/"); sub(/-[0-9]+$/, "", part[2]); keep(part[2], $3) }
END {
	printf "%-8s %12s %22s %22s\n", "", "own", "gonum / own", "plain / own"
	split("pulse flow events", work, " ")
	for (i = 1; i <= 3; i++) {
		w = work[i]; own = median(w " own")
		printf "%-8s %9.1f ns %22.2f %22.2f\n", w, own, median(w " gonum") / own, median(w " plain") / own
	}
	printf "two workers: %.2f times one\n", median("one") / median("two")
}' "$out"
