"""A second opinion on a session: python3 witness.py SESSION.toml prints every quantity, and every series' mean and variance,
as JSON. It shares no code and no reader with the program; its definitions are those of the published pages, not of lib/."""
import json
import sys

import quantities
import readers


def measure(session_file):
    """{region: {"quantities": {name: value}, "reasons": {name: why not}, "series": [...], "hits": number}}"""
    session = readers.read_session(session_file)
    answer = {}
    for region in session.regions:
        witness = quantities.RegionWitness(session, region)
        values, reasons = witness.all()
        answer[region.name] = {
            "quantities": values, "reasons": reasons, "hits": sum(level.hits for level in witness.levels),
            "series": [{"kind": level.series.kind, "files": level.series.files, "mean_dn": level.mean,
                        "variance_dn2": level.variance, "saturated_fraction": level.saturated, "hits": level.hits}
                       for level in witness.levels]}
    return answer


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit("usage: witness.py SESSION.toml")
    print(json.dumps(measure(sys.argv[1]), indent=1))
