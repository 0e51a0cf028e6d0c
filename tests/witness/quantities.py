"""Every quantity of one region from its definition, by brute force. Names are those of result.json."""
import dataclasses
import math

import numpy
from scipy import stats

import lines
import stacks

CLIPPED_SHARE = 0.002  # INTERFACE, Saturation
GAIN_RANGE = 0.7
LINEARITY_RANGE = (0.05, 0.95)
PHOTONS_PER_JOULE_METRE = 5.034116567543e24  # 1 / (h c), METHODS RA-01


@dataclasses.dataclass
class Level:
    """What a series of one region says."""
    series: object
    frames: numpy.ndarray
    hits: int
    mean: float
    saturated: float
    variance: float = math.nan
    signal: float = math.nan
    dark_variance: float = math.nan

    @property
    def freedom(self):
        return self.frames[0].size * (len(self.frames) - 1)

    @property
    def exposure(self):
        return self.series.exposure_s

    @property
    def light_time(self):
        return self.series.exposure_s * self.series.light


def code_step(series):
    codes = numpy.unique(numpy.concatenate([numpy.unique(one.frames) for one in series]))
    return float(numpy.min(numpy.diff(codes)))


def block_edges(region_rows, region_columns):
    """Edges of 16 x 16 nearly equal blocks; the scenes and samples have blocks of 64 pixels and more."""
    rows = [i * region_rows // 16 for i in range(17)]
    columns = [i * region_columns // 16 for i in range(17)]
    return [(slice(a, b), slice(c, d)) for a, b in zip(rows, rows[1:]) for c, d in zip(columns, columns[1:])]


def unclipped(block, top, edge):
    """Mean and standard deviation of the normal distribution that, cut off at `edge`, has the block's mean and its share at
    the top code; the share. A block of top codes alone has neither. METHODS 3.1, clipped-normal moments."""
    share = numpy.mean(block == top)
    if share == 0:
        return block.mean(), block.std(), 0.0
    if share == 1:
        return None, None, 1.0
    at = stats.norm.ppf(share)
    clipped = numpy.minimum(block, edge).mean()
    spread = (clipped - edge) / (at - stats.norm.pdf(at) - at * share)
    return edge + at * spread, spread, share


class RegionWitness:
    def __init__(self, session, region):
        self.session, self.region = session, region
        self.values, self.reasons = {}, {}
        self.step = code_step(session.series)
        self.quantization = self.step ** 2 / 12
        cut = [one.frames[:, region.rows, region.columns] for one in session.series]
        self.blocks = block_edges(*cut[0].shape[1:])
        self.top = self.top_code(cut)
        self.levels = [self.level(one, frames) for one, frames in zip(session.series, cut)]
        self.darks = sorted((level for level in self.levels if level.series.is_dark), key=lambda level: level.exposure)
        self.flats = sorted((level for level in self.levels if not level.series.is_dark), key=lambda level: level.mean)
        self.measure_darks()
        self.measure_flats()

    def top_code(self, cut):
        brightest = max((frames for one, frames in zip(self.session.series, cut) if not one.is_dark), key=numpy.mean)
        codes, counts = numpy.unique(brightest, return_counts=True)
        code = codes[numpy.argmax(counts)]
        if any(numpy.mean(brightest[:, rows, columns] == code) > 0.5 for rows, columns in self.blocks):
            return float(code)
        return (2.0 ** self.session.camera["bit_depth"] - 1) * self.step

    def level(self, series, frames):
        saturated, hits = float(numpy.mean(frames == self.top)), 0
        if saturated <= CLIPPED_SHARE:  # the scatter of clipped pixels is no measure of a hit
            frames, hits = stacks.without_hits(frames, self.step)
        return Level(series, frames, hits, float(frames.mean()), saturated)

    def measure_darks(self):
        for level in self.darks:
            level.variance = stacks.temporal_variance(level.frames, level.hits)
        exposures = [level.exposure for level in self.darks]
        self.mean_line = lines.weighted_line(exposures, [level.mean for level in self.darks],
                                             [len(level.frames) for level in self.darks])
        self.variance_line = lines.likelihood_line(exposures, [level.variance for level in self.darks],
                                                   [level.freedom for level in self.darks])

    def measure_flats(self):
        for level in self.flats:
            dark = self.mean_line[0] + self.mean_line[1] * level.exposure
            level.signal = level.mean - dark
            level.dark_variance = self.variance_line[0] + self.variance_line[1] * level.exposure
            level.variance = stacks.temporal_variance(level.frames, level.hits, dark)

    def put(self, name, value):
        self.values[name] = float(value)

    def put_root(self, name, square, divisor=1.0):
        if square >= 0:
            self.put(name, math.sqrt(square) / divisor)
        else:
            self.reasons[name] = f"the variance is negative, {square:.4g} DN^2"

    def all(self):
        self.saturation()
        self.gain()
        self.dark_noise()
        self.dark_current()
        self.response()
        self.non_uniformity()
        self.derived()
        return self.values, self.reasons

    # Saturation: per block the signal where 0.2 % sit at the top code, pixels normally distributed between levels.
    def saturation(self):
        edge = self.top - self.step / 2
        wanted = stats.norm.ppf(CLIPPED_SHARE)
        found = []
        for rows, columns in self.blocks:
            below = None
            for level in self.flats:
                block = level.frames[:, rows, columns]
                center, spread, share = unclipped(block, self.top, edge)
                if share >= CLIPPED_SHARE:
                    break
                below = level, center, spread
            else:
                continue  # this block does not saturate
            if below is None:
                continue
            level_below, low, low_spread = below
            dark = self.mean_line[0] + self.mean_line[1] * level_below.exposure
            if spread is None:  # all of the next level sits at the top code
                found.append(edge + wanted * low_spread - dark)
                continue
            from_low, from_high = (low - edge) / low_spread, (center - edge) / spread
            found.append(low + (center - low) * (wanted - from_low) / (from_high - from_low) - dark)
        self.range_top = float(numpy.median(found)) if 2 * len(found) > len(self.blocks) else None
        if self.range_top is None:
            raise SystemExit("the witness expects sessions that saturate")
        self.put("saturation_dn", self.range_top)

    def usable(self, low, high):
        return [level for level in self.flats if low * self.range_top <= level.signal <= high * self.range_top
                and level.saturated <= CLIPPED_SHARE]

    def gain(self):
        self.gain_levels = self.usable(0, GAIN_RANGE)
        signals = [level.signal for level in self.gain_levels]
        at_zero = self.variance_line[0]
        # What dark current adds at a level's exposure is no light: the dark point stands for darkness at no exposure.
        x = [0.0, *signals]
        variance = [at_zero, *(level.variance - (level.dark_variance - at_zero) for level in self.gain_levels)]
        freedom = [self.darks[0].freedom, *(level.freedom for level in self.gain_levels)]
        line = lines.likelihood_line(x, variance, freedom)[1]
        _, curved, curvature, error = lines.likelihood_curve(x, variance, freedom)
        self.put("conversion_gain_line_dn_per_e", line)
        self.put("conversion_gain_curved_dn_per_e", curved)
        self.put("variance_curvature_per_e", curvature)
        model = self.session.analysis.get("gain_model", "auto")
        self.is_curved = model == "curved" or (model == "auto" and abs(curvature) >= 5 * error)
        self.factor = curved if self.is_curved else line
        self.put("conversion_gain_dn_per_e", self.factor)
        self.put("conversion_gain_e_per_dn", 1 / self.factor)
        self.put("conversion_gain_origin_line_dn_per_e", lines.origin_slope(
            signals, [level.variance - level.dark_variance for level in self.gain_levels]))
        # Variance of the whole series, covariances of its first pair; weights of a sum of nine terms of one size.
        summed = [variance[0] + stacks.neighbour_covariances(self.darks[0].frames)]
        for level, one in zip(self.gain_levels, variance[1:]):
            summed.append(one + stacks.neighbour_covariances(level.frames, level.mean - level.signal))
        self.put("conversion_gain_lag_summed_dn_per_e", lines.likelihood_line(x, summed, numpy.ones(len(x)))[1])

    def dark_noise(self):
        shortest = self.darks[0]
        self.put("dark_offset_dn", shortest.mean)
        square = shortest.variance - self.quantization
        if self.variance_line[1] * shortest.exposure >= 0.05 * shortest.variance:
            square = self.variance_line[0] - self.quantization
        self.threshold_dn = math.sqrt(shortest.variance)
        self.put("read_noise_dn", math.sqrt(square))
        self.put("read_noise_e", math.sqrt(square) / self.factor)
        count = len(shortest.frames)
        if count >= 16:
            middle = stacks.median_of_true_deviations(stacks.variance_map(shortest.frames), count)
            self.put_root("read_noise_median_e", middle ** 2 - self.quantization, self.factor)
        else:
            self.reasons["read_noise_median_e"] = "fewer than 16 dark frames"
        row, pixel = stacks.row_and_pixel_noise(shortest.frames)
        self.row_noise = max(row, 0.0)  # of the read-out: the same in all series
        self.put_root("row_noise_dn", row)
        self.put_root("row_noise_e", row, self.factor)
        rows, columns = shortest.frames.shape[1:]
        scatter = shortest.frames.mean(axis=(1, 2)).var(ddof=1)
        self.put_root("offset_jitter_dn", scatter - row / rows - pixel / (rows * columns))

    def dark_current(self):
        self.put("dark_current_dn_per_s", self.mean_line[1])
        self.put("dark_current_e_per_s", self.mean_line[1] / self.factor)
        self.put("dark_current_from_variance_e_per_s", self.variance_line[1] / self.factor ** 2)

    # The line of the linearity error: weights 1/y^2 (METHODS 4).
    def response(self):
        used = self.usable(*LINEARITY_RANGE)
        x, y = (numpy.array([getattr(level, key) for level in used]) for key in ("light_time", "signal"))
        intercept, slope = lines.weighted_line(x, y, 1 / y ** 2)
        self.put("linearity_error_percent", 100 * numpy.mean(numpy.abs((y - intercept - slope * x) / (intercept + slope * x))))
        if len({level.exposure for level in used}) >= 3:
            self.put("shutter_offset_s", intercept / slope)
        else:
            self.reasons["shutter_offset_s"] = "the exposure is the same at all levels"
        half = [level for level in self.flats if level.signal >= 0.5 * self.range_top]
        signals = [level.signal for level in half]
        deviation = [100 * (level.signal / (intercept + slope * level.light_time) - 1) for level in half]
        at = next((i for i, one in enumerate(deviation) if abs(one) >= 1), None)
        if at is None or at == 0:
            self.reasons["linear_full_well_e"] = "no crossing of 1 % above half range"
            return
        share = (math.copysign(1, deviation[at]) - deviation[at - 1]) / (deviation[at] - deviation[at - 1])
        self.put("linear_full_well_e", (signals[at - 1] + share * (signals[at] - signals[at - 1])) / self.factor)

    def non_uniformity(self):
        most = max(len(level.frames) for level in self.darks)
        dark = next(level for level in self.darks if len(level.frames) == most)
        dark_parts = stacks.spatial_parts(dark.frames, dark.variance, self.row_noise)
        self.put_root("dsnu_dn", dark_parts[""])
        for part, square in dark_parts.items():
            self.put_root(f"dsnu_{part}e", square, self.factor)
        unclipped = [level for level in self.flats if level.saturated <= CLIPPED_SHARE]
        flat = min(unclipped, key=lambda level: abs(level.signal - self.range_top / 2))
        flat_parts = stacks.spatial_parts(flat.frames, flat.variance, self.row_noise)
        matched = min(self.darks, key=lambda level: abs(level.exposure - flat.exposure))
        matched_parts = stacks.spatial_parts(matched.frames, matched.variance, self.row_noise)
        for part, square in flat_parts.items():
            self.put_root(f"prnu_{part}percent", square - matched_parts[part], flat.signal / 100)

    def derived(self):
        capacity = self.range_top / self.factor
        threshold = self.threshold_dn / self.factor + 0.5
        ratio = capacity / threshold
        self.put("saturation_capacity_e", capacity)
        self.put("absolute_threshold_e", threshold)
        self.put("dynamic_range_ratio", ratio)
        self.put("dynamic_range_db", 20 * math.log10(ratio))
        self.put("dynamic_range_bits", math.log2(ratio))
        self.put("snr_max_ratio", math.sqrt(capacity))
        self.put("snr_max_db", 10 * math.log10(capacity))
        light = self.session.light
        if "irradiance_w_per_m2" not in light:
            return
        area = (self.session.camera["pixel_pitch_um"] * 1e-6) ** 2
        photons = [PHOTONS_PER_JOULE_METRE * area * light["irradiance_w_per_m2"] * light["wavelength_nm"] * 1e-9 * level.light_time
                   for level in self.gain_levels]
        responsivity = lines.origin_slope(photons, [level.signal for level in self.gain_levels])
        self.put("responsivity_dn_per_photon", responsivity)
        self.put("quantum_efficiency_percent", 100 * responsivity / self.factor)
        self.put("absolute_threshold_photons", threshold / (responsivity / self.factor))
