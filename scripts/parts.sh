# Sourced by scripts/test and scripts/check_full: named parts, their time and outcome, and the closing line.

mkdir -p build/logs
checks_passed=0
checks_failed=0
ctest_logs=()
export UBSAN_OPTIONS=print_stacktrace=1

# part NAME COMMAND...: runs the command; its output is shown only when it fails.
part() {
  local name=$1 log=build/logs/part.log begin=$SECONDS outcome=ok
  shift
  "$@" >"$log" 2>&1 || outcome=FAILED
  [ "$outcome" = ok ] || tail -n 100 "$log"
  # Cases of ctest are counted one by one from its log; everything else is one check, a ctest that ran nothing too.
  if [ "$1" != run_ctest ] || { [ "$outcome" = FAILED ] && [ -s "$log" ]; }; then
    if [ "$outcome" = ok ]; then checks_passed=$((checks_passed + 1)); else checks_failed=$((checks_failed + 1)); fi
  fi
  printf '%-40s %-6s %5d s\n' "$name" "$outcome" $((SECONDS - begin))
  [ "$outcome" = ok ]
}

# build_preset PRESET TARGET...: configures and builds.
build_preset() {
  cmake --preset "$1" && cmake --build --preset "$1" --target "${@:2}"
}

# run_ctest PRESET ARGUMENT...: one test at a time, because many use all cores themselves.
run_ctest() {
  local log=build/logs/ctest_$1.log
  rm -f "$log"
  ctest_logs+=("$log")
  ctest --test-dir "build/$1" --verbose --no-tests=error --timeout 600 "${@:2}" >"$log" 2>&1 && return
  grep -q '% tests passed' "$log" || cat "$log"
  return 1
}

# close_parts: the names of what failed, then "N passed, N failed" as the last line; exits.
close_parts() {
  local counts=build/logs/counts.log
  : >"$counts"
  if [ ${#ctest_logs[@]} -gt 0 ]; then
    scripts/count_results "${ctest_logs[@]}" >"$counts" || true
    grep -v '^[0-9]* passed, [0-9]* failed$' "$counts"
  fi
  awk -v passed="$checks_passed" -v failed="$checks_failed" '
    /^[0-9]+ passed, [0-9]+ failed$/ { passed += $1; failed += $3; counted = 1 }
    END { print passed " passed, " failed " failed"; exit (failed > 0 || !counted) }' "$counts"
  exit
}
