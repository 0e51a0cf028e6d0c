"""Two invented cameras for the witness, as scene files of `evenfield synth`. Neither has hits: what counts as one is a choice, not
a definition. Near saturation the levels stand closer than the pixels scatter, so that it hardly matters how one interpolates."""

CCD = """
schema = 1
seed = 811
acquired = 2026-10-02T08:00:00Z

[frame]
width = 256
height = 160

[camera]
label = "two outputs"
serial = "BENCH-CCD"
detector = "ccd"
mode = "100 kHz"
bit_depth = 16
offset_dn = 1000.0
gain_dn_per_e = 0.65
read_noise_e = 7.0
dsnu_e = 2.5
row_pattern_e = 1.0
prnu_percent = 0.6
row_pattern_percent = 0.2
dark_current_e_per_s = 3.0
hot_fraction = 0.001
hot_rate_e_per_s = 20.0

[[amplifier]]
name = "left"
width = 128

[[amplifier]]
name = "right"
width = 128
gain_dn_per_e = 0.71
offset_dn = 1100.0
read_noise_e = 9.0

[light]
electrons_per_s_at_1 = 1e5
wavelength_nm = 640
vignetting = 0.04
drift_percent = 0.2
trend_percent = 1.0

[[series]]
kind = "bias"
frames = 16
temperature_c = -40.0

[[series]]
kind = "dark"
exposures_s = [1.0, 20.0, 60.0]
frames = 6
temperature_c = -40.0

[[series]]
kind = "flat"
exposure_s = 1.0
lights = [
    0.01, 0.04, 0.08, 0.15, 0.22, 0.3, 0.38, 0.46, 0.54, 0.62, 0.7, 0.78, 0.84, 0.874, 0.88, 0.886, 0.892, 0.898,
    0.904, 0.91, 0.916, 0.922, 0.928, 0.934, 0.94, 0.946, 0.952, 0.958, 0.964, 0.97, 0.976, 0.982, 0.988, 0.994,
    1.0, 1.006, 1.2, 1.4
]
frames = 4
temperature_c = -40.0

[output]
format = "tiff"
compression = "deflate"
stacks = false
"""

# The codes stand four bits up in the file: their step is 16.
CMOS = """
schema = 1
seed = 4242
acquired = 2026-10-03T08:00:00Z

[frame]
width = 192
height = 160

[camera]
label = "rolling shutter"
serial = "BENCH-CMOS"
detector = "cmos"
mode = "high gain"
bit_depth = 12
left_shift = 4
offset_dn = 120.0
gain_dn_per_e = 0.55
read_noise_e = 1.9
read_noise_spread = 0.25
row_noise_e = 0.7
offset_jitter_dn = 0.4
dsnu_e = 1.2
column_pattern_e = 0.8
prnu_percent = 0.8
column_pattern_percent = 0.3
dark_current_e_per_s = 4.0
pixel_pitch_um = 5.0
quantum_efficiency = 0.6

[light]
wavelength_nm = 525
irradiance_w_per_m2 = 4e-3
irradiance_relative_standard_uncertainty = 0.02
vignetting = 0.06

[[series]]
kind = "bias"
frames = 20
temperature_c = 5.0

[[series]]
kind = "dark"
exposures_s = [0.02, 3.0, 10.0]
frames = 8
temperature_c = 5.0

[[series]]
kind = "flat"
exposures_s = [
    0.0005, 0.0015, 0.003, 0.006, 0.009, 0.012, 0.015, 0.018, 0.021, 0.024, 0.027, 0.03, 0.032, 0.0335, 0.035,
    0.0365, 0.038, 0.039, 0.04, 0.0404, 0.0408, 0.0412, 0.0416, 0.042, 0.0424, 0.0428, 0.0432, 0.0436, 0.044,
    0.0444, 0.0448, 0.0452, 0.0456, 0.046, 0.0464, 0.05, 0.06
]
frames = 5
temperature_c = 5.0

[output]
format = "fits"
"""

# The CCD with flats of a minute: their dark current makes a pattern of its own, which is that of the 60 s dark and of no other.
CCD_OF_LONG_FLATS = CCD.replace("exposure_s = 1.0\n", "exposure_s = 60.0\n").replace("at_1 = 1e5", "at_1 = 1600.0")
