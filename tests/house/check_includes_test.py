"""scripts/check_includes passes this tree and finds each kind of violation that is planted in a made-up one."""
import pathlib
import subprocess
import tempfile
import unittest

ROOT = pathlib.Path(__file__).resolve().parents[2]
SCRIPT = ROOT / "scripts" / "check_includes"

# file, its text, what the one line of the answer must hold
PLANTED = [
    ("lib/base/a.h", '#include "formats/frame_file.h"\n', "lib/base/a.h:1: found formats/frame_file.h"),
    ("lib/simulate/a.cpp", '\n#include "model/moments.h"\n', "lib/simulate/a.cpp:2: found model/moments.h"),
    ("lib/simulate/a.cpp", '#include "analyse/gain.h"\n', "found analyse/gain.h"),
    ("lib/accumulate/a.cpp", '#include "ingest/session_reader.h"\n', r"expected base/*.h, ingest/frame_stack\.h"),
    ("lib/analyse/a.cpp", '#include "accumulate/geometry.h"\n', "found accumulate/geometry.h"),
    ("lib/analyse/a.cpp", '#include "ingest/session.h"\n', "found ingest/session.h"),
    ("lib/report/a.cpp", '#include "analyse/analyse.h"\n', "found analyse/analyse.h"),
    ("lib/report/a.cpp", '#include "judge/judge.h"\n', "found judge/judge.h"),
    ("lib/model/a.h", '#include "../base/error.h"\n', "found ../base/error.h"),
    ("lib/model/a.h", '#include "b.h"\n', "found b.h, expected FOLDER/HEADER.h"),
    ("lib/analyse/a.cpp", '#include "pipeline.h"\n', "found pipeline.h"),
    ("lib/helpers/a.h", "", "found a folder helpers"),
    ("lib/formats/fits_reader.cpp", "#include <tiffio.h>\n", "found tiffio.h"),
    ("lib/formats/tiff_reader.h", "#include <tiffio.h>\n", "found tiffio.h"),
    ("lib/ingest/a.cpp", "  #  include <fitsio.h>\n", "found fitsio.h"),
    ("lib/report/a.cpp", "#include <nlohmann/json.hpp>\n", "found nlohmann/json.hpp"),
    ("lib/ingest/a.cpp", "#include <toml++/toml.h>\n", "found toml++/toml.h"),
    ("lib/model/a.cpp", "#include <opencv2/core.hpp>\n", "found opencv2/core.hpp"),
    ("lib/base/a.cpp", "#include <iostream>\n", "found iostream"),
    ("lib/base/a.cpp", 'void f() { std::cout << "x"; }\n', "found std::cout"),
    ("lib/base/a.cpp", 'void f() { printf("x"); }\n', "found printf("),
    ("lib/base/a.cpp", 'void f() { std::fprintf(stderr, "x"); }\n', "found fprintf("),
    ("lib/base/a.cpp", "void f() { std::exit(1); }\n", "found std::exit"),
    ("lib/base/a.cpp", "void f() { abort(); }\n", "found abort("),
]
ALLOWED = [
    ("lib/base/a.cpp", '#include <cstdio>\n#include "base/a.h"\n'),
    ("lib/accumulate/a.cpp", '#include "ingest/frame_stack.h"\n#include "base/error.h"\n'),
    ("lib/analyse/a.cpp", '#include "accumulate/series_statistics.h"\n#include "model/m.h"\n#include "result/r.h"\n'),
    ("lib/formats/tiff_reader.cpp", "#include <tiffio.h>\n"),
    ("lib/model/spectrum.cpp", "#include <opencv2/core.hpp>\n"),
    ("lib/result/result_json.cpp", "#include <nlohmann/json.hpp>\n"),
    ("lib/pipeline.cpp", '#include "pipeline.h"\n#include "ingest/session.h"\n#include "report/report.h"\n'),
    ("tools/main.cpp", "#include <iostream>\n#include <boost/program_options.hpp>\nint main() { std::cout << 1; }\n"),
    ("lib/base/b.cpp", '// std::cout, exit(1)\n/* printf("x")\n abort() */\nconst char* text = "exit(1)";\n'),
    ("lib/base/c.cpp", 'void f(char* b, FILE* f) { snprintf(b, 1, "x"); fprintf(f, "x"); _exit(1); }\n'),
]


def check(root):
    return subprocess.run([SCRIPT, root], capture_output=True, text=True, check=False)


class CheckIncludes(unittest.TestCase):
    def test_this_tree_keeps_to_the_arrows(self):
        run = check(ROOT)
        self.assertEqual(run.returncode, 0, run.stderr)

    def test_each_planted_violation_is_found_and_named(self):
        for file, text, expected in PLANTED:
            with self.subTest(file=file, text=text), tempfile.TemporaryDirectory() as folder:
                path = pathlib.Path(folder, file)
                path.parent.mkdir(parents=True)
                path.write_text(text, encoding="utf-8")
                run = check(folder)
                self.assertEqual(run.returncode, 1)
                self.assertEqual(len(run.stderr.splitlines()), 1, run.stderr)
                self.assertIn(expected, run.stderr)

    def test_what_is_allowed_passes(self):
        with tempfile.TemporaryDirectory() as folder:
            for file, text in ALLOWED:
                path = pathlib.Path(folder, file)
                path.parent.mkdir(parents=True, exist_ok=True)
                path.write_text(text, encoding="utf-8")
            run = check(folder)
            self.assertEqual((run.returncode, run.stderr), (0, ""))


if __name__ == "__main__":
    unittest.main()
