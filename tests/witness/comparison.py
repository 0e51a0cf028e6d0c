"""How far program and witness may be apart, quantity by quantity, and whether they are."""
import dataclasses

DEFINITION = 1e-6  # relative: nothing but the definition and the frames decides
FIT = 0.1          # of the stated standard uncertainty: weights or iterations may differ

BY_DEFINITION = {"dark_offset_dn", "read_noise_dn", "dsnu_dn", "linearity_error_percent", "dark_current_dn_per_s",
                 "shutter_offset_s", "responsivity_dn_per_photon"}

# Where the pages leave room for more than rounding. (share of the standard uncertainty, why)
SATURATION = (0.5, "0.2 % of a small block is less than one sample; the pages fix no rule for such counts")
OPEN = {name: SATURATION for name in (
    "saturation_dn", "saturation_capacity_e", "dynamic_range_ratio", "dynamic_range_db", "dynamic_range_bits", "snr_max_ratio",
    "snr_max_db")}
OPEN["conversion_gain_lag_summed_dn_per_e"] = (1.0, "which pairs of neighbours at borders, and whose variance, is not fixed")
OPEN["read_noise_median_e"] = (0.5, "the witness takes a log-normal population, the program the first term of how unequal pixels move a median")
HITS_DIFFER = (0.25, "program and witness count hits differently: the pages give no threshold")


@dataclasses.dataclass
class Line:
    name: str
    region: str
    program: float | None
    witness: float | None
    difference: float | None  # in units of the tolerance; more than 1 disagrees
    remark: str

    @property
    def compared(self):
        return self.difference is not None

    @property
    def agrees(self):
        return not self.compared or self.difference <= 1

    def __str__(self):
        def number(value):
            return "null" if value is None else f"{value:.10g}"

        difference = "-" if self.difference is None else f"{self.difference:.2g}"
        return (f"{'' if self.agrees else 'DISAGREE '}{self.name} [{self.region}] program {number(self.program)} "
                f"witness {number(self.witness)} difference {difference} x tolerance ({self.remark})")


def relative(program, witness):
    return abs(program - witness) / max(abs(witness), 1e-300) if program != witness else 0.0


def compare_quantity(quantity, witness, reason, has_hits):
    """One entry of result.json against the witness' value, or its reason for none."""
    name, program = quantity["name"], quantity["value"]
    uncertainty = quantity["standard_uncertainty"]

    def line(difference, remark):
        return Line(name, quantity["region"], program, witness, difference, remark)

    if program is None:
        high = quantity.get("high95")
        if witness is None:
            return line(None if reason is None else 0.0, reason or "the witness does not compute it")
        return line(0.0 if high is not None and witness <= high else float("inf"), "null, with an upper limit")
    if witness is None:
        return line(None if reason is None else float("inf"), reason or "the witness does not compute it")
    if name in BY_DEFINITION and not has_hits:
        return line(relative(program, witness) / DEFINITION, "1e-6 relative")
    share, why = OPEN.get(name, (FIT, ""))
    return line(abs(program - witness) / (share * uncertainty), f"{share} u" + (f": {why}" if why else ""))


def compare_series(entry, own):
    """Mean, variance and share at the top code of one series."""
    label = f"{entry['kind']} {own['files'][0]}"
    hits = entry["hits"] or own["hits"]

    def line(key, difference, remark):
        return Line(f"{key} of {label}", entry["region"], entry[key], own[key], difference, remark)

    yield line("saturated_fraction", relative(entry["saturated_fraction"], own["saturated_fraction"]) / DEFINITION, "1e-6 relative")
    if own["saturated_fraction"] > 0.002:
        # Such levels take part in nothing, and hits are not to be told from pixels that are clipped in the other frames.
        yield line("mean_dn", relative(entry["mean_dn"], own["mean_dn"]) / DEFINITION, "1e-6 relative")
        return
    for key, uncertainty in (("mean_dn", "mean_uncertainty_dn"), ("variance_dn2", "variance_uncertainty_dn2")):
        if hits:
            share, why = (FIT, "hits set aside") if entry["hits"] == own["hits"] else HITS_DIFFER
            yield line(key, abs(entry[key] - own[key]) / (share * entry[uncertainty]), f"{share} u: {why}")
        else:
            yield line(key, relative(entry[key], own[key]) / DEFINITION, "1e-6 relative")


def compare(result, witness):
    """All lines of a result.json against what witness.measure gives for the same session."""
    for region, own in witness.items():
        series = [entry for entry in result["series"] if entry["region"] == region]
        if len(series) != len(own["series"]):
            raise AssertionError(f"{region}: the program lists {len(series)} series, the witness {len(own['series'])}")
        has_hits = bool(own["hits"]) or any(entry["hits"] for entry in series if entry["saturated_fraction"] <= 0.002)
        for entry, mine in zip(series, own["series"]):
            if entry["files"][0] != mine["files"][0]:
                raise AssertionError(f"{region}: series {mine['files'][0]} stands at the place of {entry['files'][0]}")
            yield from compare_series(entry, mine)
        listed = set()
        for quantity in (entry for entry in result["quantities"] if entry["region"] == region):
            listed.add(quantity["name"])
            name = quantity["name"]
            yield compare_quantity(quantity, own["quantities"].get(name), own["reasons"].get(name), has_hits)
        for name in sorted({*own["quantities"], *own["reasons"]} - listed):
            yield Line(name, region, None, own["quantities"].get(name), None, "skipped: result.json does not list it")


def contradictions(result):
    """Where quantities of one result, derived from others by an equation of the pages, do not obey it."""
    for region in {entry["region"] for entry in result["quantities"]}:
        value = {entry["name"]: entry["value"] for entry in result["quantities"] if entry["region"] == region}
        gain = value["conversion_gain_dn_per_e"]
        pairs = [("conversion_gain_e_per_dn", 1 / gain)]
        pairs += [(f"{name}_e", value[f"{name}_dn"] / gain) for name in ("read_noise", "row_noise", "dsnu")
                  if value.get(f"{name}_dn") is not None]
        capacity = value["saturation_dn"] / gain
        ratio = capacity / value["absolute_threshold_e"]
        pairs += [("saturation_capacity_e", capacity), ("dynamic_range_ratio", ratio), ("snr_max_ratio", capacity ** 0.5)]
        if value.get("quantum_efficiency_percent") is not None:
            efficiency = value["responsivity_dn_per_photon"] / gain
            pairs += [("quantum_efficiency_percent", 100 * efficiency),
                      ("absolute_threshold_photons", value["absolute_threshold_e"] / efficiency)]
        for name, expected in pairs:
            if relative(value[name], expected) > 1e-9:
                yield f"{name} [{region}] is {value[name]!r}, the other quantities give {expected!r}"
