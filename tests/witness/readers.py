"""Session file and frames, read by readers that share nothing with the program: tomllib, tifffile and astropy."""
import dataclasses
import pathlib
import tomllib

import numpy
import tifffile
from astropy.io import fits


@dataclasses.dataclass
class Series:
    """One [[series]] of the session file with its pixels."""
    kind: str
    exposure_s: float
    light: float
    files: list
    frames: numpy.ndarray  # frame, row, column; float64, in DN as stored

    @property
    def is_dark(self):
        return self.kind in ("dark", "bias")


@dataclasses.dataclass
class Region:
    name: str
    rows: slice
    columns: slice


@dataclasses.dataclass
class Session:
    camera: dict
    light: dict
    analysis: dict
    regions: list
    series: list


def read_frames(path):
    """Every frame of one file, in its order, as frame x row x column."""
    if path.suffix.lower() in (".tif", ".tiff"):
        with tifffile.TiffFile(path) as file:
            return [page.asarray().astype(numpy.float64) for page in file.pages]
    found = []
    with fits.open(path) as file:
        for unit in file:
            if unit.data is not None:
                data = numpy.asarray(unit.data, numpy.float64)
                found.extend(data.reshape(-1, *data.shape[-2:]))
    return found


def read_session(path):
    path = pathlib.Path(path)
    table = tomllib.loads(path.read_text(encoding="utf-8"))
    series = []
    for entry in table["series"]:
        files = [file for pattern in entry["files"] for file in sorted(path.parent.glob(pattern))]
        if not files:
            raise SystemExit(f"{path}: {entry['files']} match nothing")
        frames = numpy.stack([frame for file in files for frame in read_frames(file)])
        series.append(Series(entry["kind"], float(entry.get("exposure_s", 0.0)), float(entry.get("light", 1.0)),
                             [file.name for file in files], frames))
    height, width = series[0].frames.shape[1:]
    regions = [Region(entry["name"], slice(entry["y"], entry["y"] + entry["height"]),
                      slice(entry["x"], entry["x"] + entry["width"])) for entry in table.get("region", [])]
    return Session(table.get("camera", {}), table.get("light", {}), table.get("analysis", {}),
                   regions or [Region("whole", slice(0, height), slice(0, width))], series)
