#!/usr/bin/python3
"""Times `evenfield measure` and what else reads the same frames, side by side; scripts/bench runs it.

Prints Markdown tables: for each kind of session, the median wall time of evenfield and of each other program, and the ratio of the
two within a round, with its median and quartiles; peak memory; and whether the number of threads shows in the result. In a
round every program runs once, in an order drawn anew, on files that are in the page cache. This process stays small, since a
child's peak memory counts what its parent had."""
import argparse
import csv
import datetime
import os
import pathlib
import platform
import random
import re
import shutil
import statistics
import subprocess
import sys
import tempfile
import time

ROOT = pathlib.Path(__file__).resolve().parents[2]
HERE = pathlib.Path(__file__).resolve().parent
CONTAINERS = {"tiff": "TIFF", "fits": "FITS", "deflate": "deflate TIFF", "rice": "Rice FITS"}
# Largest ratios that are asked for, on two cores at the full size.
AT_MOST = {("tiff", "cat"): "2.2", ("even", "cat"): "1.8", ("fits", "cat"): "2.3", ("tiff", "NumPy"): "1/12",
           ("tiff", "OpenCV-float"): "1/12", ("tiff", "OpenCV-double"): "1/12",
           ("deflate", "decoder"): "0.65", ("rice", "decoder"): "0.60"}


def say(text):
    print(f"bench: {text}", file=sys.stderr, flush=True)


def run(command, output):
    """Wall time [s] and peak memory [kB] of one process; its standard output goes to the file `output`."""
    with open(output, "wb") as out:
        begin = time.monotonic()
        process = subprocess.Popen([str(word) for word in command], stdout=out, stdin=subprocess.DEVNULL)
        _, status, usage = os.wait4(process.pid, 0)
        seconds = time.monotonic() - begin
    process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode:
        raise SystemExit(f"bench: {command[0]}: found exit status {process.returncode}, expected 0")
    return seconds, usage.ru_maxrss


class Bench:
    def __init__(self, arguments, folder):
        self.arguments, self.folder = arguments, folder
        self.scratch = folder / "out"
        self.scratch.mkdir(exist_ok=True)
        self.benches = arguments.build / "bin"
        self.program = arguments.program or self.benches / "evenfield"

    def make(self, name, containers, *options, levels=None):
        """Frames of one kind, of those containers that are not there already."""
        size, frames, levels = self.arguments.size, str(self.arguments.frames), str(levels or self.arguments.levels)
        wanted = " ".join(["--size", size, "--levels", levels, "--frames", frames, *options])
        stamps = {container: self.folder / name / f"{container}.made" for container in containers}
        missing = [name for name, stamp in stamps.items() if not stamp.exists() or stamp.read_text() != wanted]
        if missing:
            say(f"making the frames of {name}: {', '.join(missing)}")
            for container in missing:
                stamps[container].unlink(missing_ok=True)
                shutil.rmtree(self.folder / name / container, ignore_errors=True)
            subprocess.run(["/usr/bin/python3", "-B", HERE / "make_session.py", self.folder / name, *wanted.split(), *missing],
                           check=True)
            for container in missing:
                stamps[container].write_text(wanted)
        os.sync()  # writing back would disturb the first rounds
        return self.folder / name

    def drop(self, folder):
        if not self.arguments.keep:
            shutil.rmtree(folder)

    def measure(self, session, *options):
        return [self.program, "measure", session, "--out", self.scratch / "result", "--plots", "none", "--quiet", *options]

    def programs(self, kind, folder, files):
        """name -> command, of all that is timed on one session."""
        commands = {"evenfield": self.measure(folder / "session.toml"), "cat": ["cat", *files]}
        if kind == "even":
            return commands
        commands["NumPy"] = ["/usr/bin/python3", "-B", HERE / "numpy_accumulate.py", *files]
        if kind in ("tiff", "deflate"):
            for width in ("float", "double"):
                commands[f"OpenCV-{width}"] = [self.benches / "bench_opencv_accumulate", width, *files]
        if kind in ("deflate", "rice"):
            commands["decoder"] = [self.benches / f"bench_decode_{'tiff' if kind == 'deflate' else 'fits'}", *files]
        return {name: command for name, command in commands.items() if name not in self.arguments.without}

    def time(self, kind, folder):
        """(other program, seconds of evenfield, seconds of the other) by round, and evenfield's peak memory [kB]."""
        files = sorted(path for path in folder.iterdir() if path.suffix in (".tif", ".fits"))
        commands = self.programs(kind, folder, files)
        seconds = {name: {} for name in commands}
        peak_kb = 0
        run(commands["cat"], os.devnull)  # into the page cache
        for turn in range(self.arguments.pairs):
            names = list(commands)
            if turn >= self.arguments.slow_pairs:
                names = ["evenfield", "cat"]
            elif turn > 0 and kind == "rice" and "NumPy" in names:
                names.remove("NumPy")  # Astropy takes minutes to decode them; a round is enough to see it
            random.Random(turn).shuffle(names)
            for name in names:
                # To /dev/null what is only read; the others' numbers are looked at afterwards.
                output = os.devnull if name in ("evenfield", "cat") else self.scratch / name
                seconds[name][turn], memory_kb = run(commands[name], output)
                if name == "evenfield":
                    peak_kb = max(peak_kb, memory_kb)
            say(f"{kind}, round {turn + 1} of {self.arguments.pairs}: "
                + ", ".join(f"{name} {seconds[name][turn]:.2f} s" for name in names))
        self.check_means(kind)
        ours = seconds.pop("evenfield")
        return [(name, ours, theirs) for name, theirs in seconds.items()], peak_kb

    def check_means(self, kind):
        """The programs timed have to have read the same pixels: their means agree with those of series.csv."""
        with open(self.scratch / "result" / "series.csv", newline="", encoding="utf-8") as table:
            wanted = [float(row["mean_dn"]) for row in csv.DictReader(table)]
        for name in ("NumPy", "OpenCV-float", "OpenCV-double"):
            if not (self.scratch / name).exists():
                continue
            found = [float(line.split()[0]) for line in (self.scratch / name).read_text().splitlines()]
            (self.scratch / name).unlink()
            # Hits leave the means of evenfield and not of the others: 12 x 3000 DN in a frame.
            width, height = map(int, self.arguments.size.split("x"))
            leeway = 0.01 + 12 * 3000 * 1.5 / (width * height)
            if len(found) != len(wanted) or any(abs(a - b) > leeway + 1e-5 * b for a, b in zip(sorted(found), sorted(wanted))):
                raise SystemExit(f"bench: {kind}, {name}: found other means than evenfield's, expected the same within {leeway} DN")


def of_rounds(values, digits):
    """Median and quartiles; a ratio under 1/5 as a fraction, which reads easier."""
    values = sorted(values)
    low, middle, high = statistics.quantiles(values, n=4, method="inclusive") if len(values) > 1 else values * 3
    if middle < 0.2:
        return f"1/{1 / middle:.1f} | 1/{1 / low:.1f} to 1/{1 / high:.1f}"
    return f"{middle:.{digits}f} | {low:.{digits}f} to {high:.{digits}f}"


def without_created(path):
    return re.sub(rb'"created": ?"[^"]*"', b"", path.read_bytes())


def processor():
    for line in pathlib.Path("/proc/cpuinfo").read_text().splitlines():
        if line.startswith("model name"):
            return line.partition(":")[2].strip()
    return platform.machine()


def speed_table(bench):
    rows, peaks = [], []
    wanted = bench.arguments.containers
    folder = bench.make("uneven", wanted)
    kinds = [(kind, folder / kind) for kind in wanted]
    for kind, place in [*kinds, ("even", None)]:
        if kind == "even":
            place = bench.make("even", ["tiff"], "--even") / "tiff"
        label = CONTAINERS.get(kind, "TIFF, even light, no hits")
        comparisons, peak_kb = bench.time(kind, place)
        peaks.append((label, peak_kb))
        for name, ours, theirs in comparisons:
            shown = {"decoder": "libtiff alone, 1 thread" if kind == "deflate" else "CFITSIO alone, 1 thread",
                     "cat": "`cat` of the files", "NumPy": "NumPy, frame by frame", "OpenCV-float": "OpenCV over libtiff, float sums",
                     "OpenCV-double": "OpenCV over libtiff, double sums"}[name]
            ratios = [ours[turn] / theirs[turn] for turn in theirs]
            rows.append(f"| {label} | {shown} | {of_rounds(ratios, 2)} | {AT_MOST.get((kind, name), '')} | "
                        f"{statistics.median(ours.values()):.2f} s | {statistics.median(theirs.values()):.2f} s |")
        bench.drop(place)
    print("| session | evenfield against | median ratio | quartiles | at most | evenfield | the other |")
    print("| --- | --- | --- | --- | --- | --- | --- |")
    print("\n".join(rows))
    return peaks


def memory_table(bench, peaks):
    """Peaks of the sessions timed, of 8 and 32 frames a series, and the result of 1, 2 and 4 threads."""
    folder = bench.make("long_series", ["tiff"], "--parts", "4", levels=min(6, bench.arguments.levels)) / "tiff"
    frames = bench.arguments.frames
    # Each three times: the peak depends a little on which thread was where.
    for parts in (1, 4):
        command = bench.measure(folder / f"session_{parts}.toml")
        peaks.append((f"TIFF, short session, {parts * frames} frames a series",
                      max(run(command, os.devnull)[1] for _ in range(3))))
    print("\n| session | peak memory of evenfield |\n| --- | --- |")
    for label, peak_kb in peaks:
        print(f"| {label} | {peak_kb / 1000:.1f} MB |")
    results = set()
    for threads in (1, 2, 4):
        run(bench.measure(folder / "session_4.toml", "--threads", threads), os.devnull)
        results.add(without_created(bench.scratch / "result" / "result.json"))
    print(f"\nresult.json of 1, 2 and 4 threads: {'the same' if len(results) == 1 else 'DIFFERENT'}, time aside.")
    bench.drop(folder)
    return len(results) == 1


def main():
    parser = argparse.ArgumentParser(prog="scripts/bench", allow_abbrev=False)
    parser.add_argument("--quick", action="store_true", help="a small session: does it all run?")
    parser.add_argument("--size", default="2048x2048", metavar="WIDTHxHEIGHT")
    parser.add_argument("--levels", type=int, default=50, metavar="N", help="flat levels, beside two dark series")
    parser.add_argument("--frames", type=int, default=8, metavar="N", help="frames a series")
    parser.add_argument("--pairs", type=int, default=11, metavar="N", help="rounds")
    parser.add_argument("--slow-pairs", type=int, metavar="N", help="rounds that run more than cat and evenfield (default: all)")
    parser.add_argument("--containers", default=",".join(CONTAINERS), metavar="NAME,...", help="some of the default")
    parser.add_argument("--without", action="append", default=[], metavar="NAME",
                        choices=["NumPy", "OpenCV-float", "OpenCV-double", "decoder"],
                        help="leave one out: NumPy, OpenCV-float, OpenCV-double, decoder; may be repeated")
    parser.add_argument("--keep", type=pathlib.Path, metavar="DIR", help="keep the frames there, and use those that are there")
    parser.add_argument("--program", type=pathlib.Path, help="another evenfield than that of the build")
    parser.add_argument("--build", type=pathlib.Path, default=ROOT / "build" / "release", help=argparse.SUPPRESS)
    arguments = parser.parse_args()
    arguments.containers = arguments.containers.split(",")
    if not set(arguments.containers) <= set(CONTAINERS):
        parser.error(f"--containers: found {','.join(arguments.containers)}, expected some of {','.join(CONTAINERS)}")
    if not re.fullmatch(r"[1-9]\d{1,5}x[1-9]\d{1,5}", arguments.size):
        parser.error(f"--size: found {arguments.size}, expected WIDTHxHEIGHT in pixels")
    if arguments.quick:
        arguments.size, arguments.levels, arguments.pairs = "512x512", 8, 3
    arguments.slow_pairs = arguments.pairs if arguments.slow_pairs is None else arguments.slow_pairs
    if min(arguments.pairs, arguments.slow_pairs, arguments.levels) < 1 or arguments.frames < 2:
        parser.error("found a count that is too small, expected one round, one level and two frames at least")
    width, height = map(int, arguments.size.split("x"))
    session_bytes = 2 * width * height * arguments.frames * (arguments.levels + 2)

    with tempfile.TemporaryDirectory(dir=ROOT / "build") as scratch:
        folder = arguments.keep or pathlib.Path(scratch)
        folder.mkdir(parents=True, exist_ok=True)
        need = session_bytes * (len(arguments.containers) + 2)
        there = sum(path.stat().st_size for path in folder.rglob("*") if path.is_file())  # replaced or used again
        free = shutil.disk_usage(folder).free + there
        if free < need:
            raise SystemExit(f"bench: {folder}: found {free / 1e9:.0f} GB free, expected {need / 1e9:.0f} GB for the frames")
        bench = Bench(arguments, folder)
        print(f"{processor()}, {len(os.sched_getaffinity(0))} cores, {datetime.date.today()}. {arguments.size} pixels of 16 bits, "
              f"{arguments.levels} levels and 2 dark series of {arguments.frames} frames, {session_bytes / 1e9:.2f} GB; "
              f"{arguments.pairs} rounds, page cache warm, whole processes, plots off.\n")
        peaks = speed_table(bench)
        same = memory_table(bench, peaks)
    return 0 if same else 1


if __name__ == "__main__":
    sys.exit(main())
