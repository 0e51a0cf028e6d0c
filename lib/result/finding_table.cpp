#include "result/finding_table.h"

#include <algorithm>
#include <array>

namespace evenfield {
namespace {

constexpr std::array kTable{
    FindingInfo{
        "duplicate-frames", "frames repeat",
        "Two frames hold exactly the same pixels, so their difference contains no noise and every variance "
        "that uses both comes out too low.",
        "Remove the copy, or record the series again if the camera delivered one frame twice."},
    FindingInfo{"light-drift", "light drifts",
                "The light changed from frame to frame of a series by more than its photon noise explains; "
                "each frame "
                "was scaled to the series' mean, and what remains enters the uncertainty.",
                "Let the lamp warm up, shield it from draughts, and check its supply."},
    FindingInfo{"light-banding", "rows flicker together",
                "Whole rows brighten and darken together from frame to frame under light, as when lamp "
                "ripple meets a "
                "rolling shutter; the common part was scaled out of the variance.",
                "Use a lamp on direct current, or exposures that are whole periods of its ripple."},
    FindingInfo{
        "lamp-limited", "lamp limits the result",
        "The steadiness of the light, not the camera, sets the uncertainty of the response at these levels.",
        "Steady the lamp, or repeat a reference level at the start, the middle and the end of the session."},
    FindingInfo{"exposure-mismatch", "exposure disagrees",
                "The exposure time that the session file states and the one in the frame headers differ.",
                "Correct the session file, or the setting that the headers record."},
    FindingInfo{
        "outlier-frame", "frame unlike its series",
        "One frame differs from the others of its series by more than noise and drift allow, as after a lost "
        "trigger or a lamp that failed.",
        "Look at that frame, and take it out of the session file if its conditions were not those stated."},
    FindingInfo{
        "saturated", "pixels saturate",
        "Pixels of a series lie at the top code, where the variance is cut off; such levels fix saturation "
        "and stay out of the gain.",
        "Nothing, if a level past saturation was intended; else shorten the exposure."},
    FindingInfo{
        "clipped-dark", "dark is cut off at the bottom",
        "Dark pixels lie at the lowest code, so the noise below it is lost: dark offset comes out too high, "
        "read noise too low.",
        "Raise the camera's offset until no dark pixel reaches the lowest code."},
    FindingInfo{
        "coarse-quantization", "steps too coarse for the noise",
        "The step between neighbouring codes is large against the dark noise, so that step squared over "
        "twelve no longer describes rounding and read noise is uncertain.",
        "Use a higher camera gain or a converter setting of more bits."},
    FindingInfo{
        "missing-codes", "codes never occur",
        "Codes inside the occupied range never occur in many pixels, which shows scaling in the camera or a "
        "faulty converter; local variances are distorted there.",
        "Switch off digital gain and correction in the camera; if the gaps stay, have the converter "
        "checked."},
    FindingInfo{"correlated-noise", "neighbours are correlated",
                "The noise of neighbouring pixels is correlated, as after sharing of charge or smoothing, so "
                "the plain "
                "variance understates the photon noise and the gain with it.",
                "Read the lag-summed gain, and switch off filters in the camera."},
    FindingInfo{
        "row-noise", "rows share noise",
        "All pixels of a row share part of the dark noise; it counts in read noise and is stated apart, and "
        "resampling used whole rows.",
        "Nothing for the numbers; for the camera, check supply and grounding."},
    FindingInfo{
        "uneven-illumination", "uneven light",
        "The light falls unevenly over a region, and non-uniformity of the response contains that shape.",
        "Read the high-pass quantities, or improve the evenness of the light."},
    FindingInfo{
        "unmatched-dark", "no dark matches",
        "A flat series has no dark of the same mode, temperature and exposure, so its dark level was taken "
        "from another exposure or extrapolated.",
        "Record a dark series under the conditions of each flat series."},
    FindingInfo{
        "zero-noise", "no noise at all",
        "Pixels of a series do not vary from frame to frame, as in copies, stuck or fully saturated data; no "
        "variance can be had from them.",
        "Check that the frames are raw and separately exposed."},
    FindingInfo{
        "too-few-levels", "too few levels",
        "There are fewer light levels, or exposures, than a quantity needs; it is missing or has no check of "
        "its own model.",
        "Add the levels that the message asks for."},
    FindingInfo{
        "too-few-frames", "too few frames",
        "A series has fewer frames than a quantity needs, so that it is missing or its uncertainty is wide.",
        "Record at least the number of frames that the message asks for."},
    FindingInfo{"converter-limited", "converter limits the range",
                "The signal reaches the largest code before the pixel is full, so the full well cannot be "
                "seen and is "
                "left out.",
                "Lower the camera gain if the full well is wanted; saturation capacity holds as it is."},
    FindingInfo{
        "nonlinear", "response is not a line",
        "Signal departs from a straight line of the light by more than the light and the noise explain.",
        "Use the signal only inside the range that the message names, or correct it by the response curve."},
    FindingInfo{
        "gain-switch", "gain changes inside the range",
        "Gain has one value below some signal and another above it, as in cameras that merge two readouts; "
        "one line through all levels describes neither.",
        "Measure each readout by itself, or restrict the levels to one side of the switch."},
    FindingInfo{"light-leak", "light in the dark frames",
                "Dark frames carry signal that grows and wanders like light, so dark current and offset are "
                "too high.",
                "Cover the camera fully, switch off status lamps, and record the darks again."},
    FindingInfo{
        "mixed-temperature", "temperatures differ",
        "Series that are compared with one another were taken at different sensor temperatures, which moves "
        "dark signal and offset between them.",
        "Wait until the temperature has settled, and record darks at that of the flats."},
    FindingInfo{
        "offset-regulated", "camera regulates its dark level",
        "The mean of the dark does not grow with exposure although its variance does: the camera clamps or "
        "subtracts its dark level, and the dark current from the mean is withheld.",
        "Read the dark current from the variance, or switch the regulation off."},
    FindingInfo{
        "in-camera-correction", "camera corrects its pixels",
        "The pixels look filtered, interpolated or replaced before they were stored, so that noise and "
        "patterns are not those of the sensor.",
        "Switch off noise reduction, sharpening, defect correction and lens shading in the camera."},
    FindingInfo{
        "mosaic-suspected", "looks like a colour mosaic",
        "Neighbouring pixels respond differently in a repeating pattern, as under a colour filter mosaic, "
        "which then passes for non-uniformity.",
        "State the mosaic in the session file so that each channel is measured by itself."},
    FindingInfo{
        "bit-depth-inferred", "bit depth was inferred",
        "The session file does not state the bits of the converter; they were inferred from the codes that "
        "occur, and the top code follows from them.",
        "State bit_depth in the session file."},
    FindingInfo{
        "wavelength-range", "wavelength out of range",
        "The stated wavelength lies where one photon does not free one electron, so quantities per electron "
        "and per photon cannot be told apart by photon transfer.",
        "Check wavelength_nm, or measure at a longer wavelength."},
    FindingInfo{"impossible-efficiency", "efficiency above the possible",
                "The quantum efficiency exceeds one by more than its uncertainty, which no sensor can do: "
                "irradiance, "
                "pixel pitch, wavelength or gain is wrong.",
                "Check the irradiance in the sensor's plane, its unit, and the pixel pitch with binning."},
    FindingInfo{"checksum", "checksum disagrees",
                "A checksum stored with a frame does not match its data, so the file was damaged or altered.",
                "Fetch the frame again from its source, or take it out of the session."},
};

}  // namespace

std::span<const FindingInfo> finding_table() { return kTable; }

const FindingInfo* find_finding(std::string_view code) {
  const auto row =
      std::find_if(kTable.begin(), kTable.end(), [&](const auto& info) { return info.code == code; });
  return row == kTable.end() ? nullptr : &*row;
}

}  // namespace evenfield
