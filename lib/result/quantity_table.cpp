#include "result/quantity_table.h"

#include <algorithm>
#include <array>

namespace evenfield {
namespace {

constexpr std::string_view kPtc = "J. R. Janesick, Photon Transfer, SPIE Press 2007";
constexpr std::string_view kCurve = "P. Astier et al., Astronomy & Astrophysics 629, A36 (2019)";
constexpr std::string_view kPractice = "common practice, no source";
constexpr std::string_view kEmva = "computed after the definitions of EMVA 1288 Release 4.0";

constexpr std::array kTable{
    QuantityInfo{"conversion_gain_dn_per_e", "DN/e-", "K", "conversion gain",
                 "Digital numbers per electron of the whole chain; the headline value.", kPtc},
    QuantityInfo{"conversion_gain_e_per_dn", "e-/DN", "1/K", "inverse conversion gain",
                 "Electrons per digital number.", kPtc},
    QuantityInfo{"conversion_gain_line_dn_per_e", "DN/e-", "K", "conversion gain, line",
                 "Slope of the maximum-likelihood line of temporal variance against signal.", kPtc},
    QuantityInfo{
        "conversion_gain_curved_dn_per_e", "DN/e-", "K", "conversion gain, curved model",
        "Slope at low signal of the curved mean-variance relation of sensors whose pixels repel charge.",
        kCurve},
    QuantityInfo{"conversion_gain_origin_line_dn_per_e", "DN/e-", "K", "conversion gain, origin line",
                 "Slope of the unweighted line through the origin, as EMVA 1288 draws it.", kEmva},
    QuantityInfo{
        "conversion_gain_lag_summed_dn_per_e", "DN/e-", "K", "conversion gain, lag-summed",
        "Slope of the variance plus the covariances of neighbours: for frames whose neighbours share noise.",
        kCurve},
    QuantityInfo{"variance_curvature_per_e", "1/e-", "a_00", "curvature of the variance",
                 "Curvature of the mean-variance relation, whatever its cause; 0 for a straight line.",
                 kCurve},
    QuantityInfo{"dark_offset_dn", "DN", "mu_y.dark", "dark offset",
                 "Mean dark signal at the shortest exposure.", kEmva},
    QuantityInfo{"read_noise_dn", "DN", "sigma_d", "read noise",
                 "Root mean square temporal noise without light, quantization taken out.", kPtc},
    QuantityInfo{"read_noise_e", "e-", "sigma_d", "read noise",
                 "Root mean square temporal noise without light, in electrons.", kPtc},
    QuantityInfo{"read_noise_median_e", "e-", "sigma_d", "median read noise",
                 "Median over the pixels of the temporal noise without light, in electrons.", kPractice},
    QuantityInfo{"row_noise_dn", "DN", "sigma_row", "row noise",
                 "Temporal noise in the dark that the pixels of a row share.", kEmva},
    QuantityInfo{"row_noise_e", "e-", "sigma_row", "row noise",
                 "Temporal noise in the dark that the pixels of a row share, in electrons.", kEmva},
    QuantityInfo{"offset_jitter_dn", "DN", "sigma_frame", "offset jitter",
                 "Scatter of the dark level from frame to frame.", kPractice},
    QuantityInfo{"saturation_dn", "DN", "mu_y.sat", "saturation",
                 "Signal at which 0.2 % of the pixels show the top code.", kEmva},
    QuantityInfo{"saturation_capacity_e", "e-", "mu_e.sat", "saturation capacity",
                 "Signal at saturation in electrons.", kEmva},
    QuantityInfo{"full_well_e", "e-", "mu_e.full", "full well",
                 "Signal at which the charge, not the converter, ends: the temporal variance turns down.",
                 kPtc},
    QuantityInfo{"linear_full_well_e", "e-", "mu_e.lin", "linear full well",
                 "Signal at which the response leaves its line by 1 %.", kPractice},
    QuantityInfo{"linearity_error_percent", "%", "LE", "linearity error",
                 "Mean relative deviation of the response from its line between 5 and 95 % of saturation.",
                 kEmva},
    QuantityInfo{
        "shutter_offset_s", "s", "t_0", "shutter offset",
        "Constant error of the exposure time: the light is collected for so much longer than stated.",
        kPractice},
    QuantityInfo{"dynamic_range_ratio", "1", "DR", "dynamic range",
                 "Saturation capacity over absolute threshold.", kEmva},
    QuantityInfo{"dynamic_range_db", "dB", "DR", "dynamic range",
                 "Saturation capacity over absolute threshold, 20 log10 of the ratio.", kEmva},
    QuantityInfo{"dynamic_range_bits", "bit", "DR", "dynamic range",
                 "Saturation capacity over absolute threshold, log2 of the ratio.", kEmva},
    QuantityInfo{"snr_max_ratio", "1", "SNR_max", "largest signal-to-noise ratio",
                 "Signal-to-noise ratio of a pixel at saturation.", kEmva},
    QuantityInfo{"snr_max_db", "dB", "SNR_max", "largest signal-to-noise ratio",
                 "Signal-to-noise ratio of a pixel at saturation, 20 log10 of the ratio.", kEmva},
    QuantityInfo{"absolute_threshold_e", "e-", "mu_e.min", "absolute threshold",
                 "Signal at which the signal-to-noise ratio is 1.", kEmva},
    QuantityInfo{"absolute_threshold_photons", "photons", "mu_p.min", "absolute threshold",
                 "Photons a pixel at which the signal-to-noise ratio is 1.", kEmva},
    QuantityInfo{"dsnu_dn", "DN", "DSNU", "dark signal non-uniformity",
                 "Spatial standard deviation of the noise-free dark frame.", kEmva},
    QuantityInfo{"dsnu_e", "e-", "DSNU", "dark signal non-uniformity",
                 "Spatial standard deviation of the noise-free dark frame, in electrons.", kEmva},
    QuantityInfo{"dsnu_row_e", "e-", "DSNU.row", "DSNU, rows",
                 "Part of the dark signal non-uniformity that the pixels of a row share.", kEmva},
    QuantityInfo{"dsnu_column_e", "e-", "DSNU.col", "DSNU, columns",
                 "Part of the dark signal non-uniformity that the pixels of a column share.", kEmva},
    QuantityInfo{"dsnu_pixel_e", "e-", "DSNU.pix", "DSNU, pixels",
                 "Part of the dark signal non-uniformity that neither rows nor columns share.", kEmva},
    QuantityInfo{"dsnu_highpass_e", "e-", "DSNU.hp", "DSNU, high-pass",
                 "Dark signal non-uniformity without gradients: the mean frame less its smooth part.", kEmva},
    QuantityInfo{"prnu_percent", "%", "PRNU", "photo response non-uniformity",
                 "Spatial standard deviation of the response, relative to the mean signal.", kEmva},
    QuantityInfo{"prnu_row_percent", "%", "PRNU.row", "PRNU, rows",
                 "Part of the photo response non-uniformity that the pixels of a row share.", kEmva},
    QuantityInfo{"prnu_column_percent", "%", "PRNU.col", "PRNU, columns",
                 "Part of the photo response non-uniformity that the pixels of a column share.", kEmva},
    QuantityInfo{"prnu_pixel_percent", "%", "PRNU.pix", "PRNU, pixels",
                 "Part of the photo response non-uniformity that neither rows nor columns share.", kEmva},
    QuantityInfo{"prnu_highpass_percent", "%", "PRNU.hp", "PRNU, high-pass",
                 "Photo response non-uniformity without gradients: uneven light is not part of it.", kEmva},
    QuantityInfo{"dark_current_dn_per_s", "DN/s", "mu_I", "dark current",
                 "Growth of the mean dark signal with exposure time.", kEmva},
    QuantityInfo{"dark_current_e_per_s", "e-/s", "mu_I", "dark current",
                 "Growth of the mean dark signal with exposure time, in electrons per pixel.", kEmva},
    QuantityInfo{"dark_current_from_variance_e_per_s", "e-/s", "mu_I", "dark current from variances",
                 "Growth of the temporal dark variance with exposure time, in electrons per pixel; a "
                 "regulated offset does not hide it.",
                 kEmva},
    QuantityInfo{"responsivity_dn_per_photon", "DN/photon", "R", "responsivity",
                 "Signal per photon that meets the pixel.", kEmva},
    QuantityInfo{"quantum_efficiency_percent", "%", "eta", "quantum efficiency",
                 "Electrons per photon that meets the pixel, of its whole area.", kEmva},
};

}  // namespace

std::span<const QuantityInfo> quantity_table() { return kTable; }

const QuantityInfo* find_quantity(std::string_view name) {
  const auto row =
      std::find_if(kTable.begin(), kTable.end(), [&](const auto& info) { return info.name == name; });
  return row == kTable.end() ? nullptr : &*row;
}

}  // namespace evenfield
