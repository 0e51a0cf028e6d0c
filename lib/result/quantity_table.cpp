#include "result/quantity_table.h"

#include <algorithm>
#include <array>

namespace evenfield {
namespace {

constexpr std::string_view kPtc = "J. R. Janesick, Photon Transfer, SPIE Press 2007";
constexpr std::string_view kEmva = "computed after the definitions of EMVA 1288 Release 4.0";

constexpr std::array kTable{
    QuantityInfo{"conversion_gain_dn_per_e", "DN/e-", "K", "conversion gain",
                 "Digital numbers per electron of the whole chain; the headline value.", kPtc},
    QuantityInfo{"conversion_gain_e_per_dn", "e-/DN", "1/K", "inverse conversion gain",
                 "Electrons per digital number.", kPtc},
    QuantityInfo{"conversion_gain_line_dn_per_e", "DN/e-", "K", "conversion gain, line",
                 "Slope of the maximum-likelihood line of temporal variance against signal.", kPtc},
    QuantityInfo{"conversion_gain_origin_line_dn_per_e", "DN/e-", "K", "conversion gain, origin line",
                 "Slope of the unweighted line through the origin, as EMVA 1288 draws it.", kEmva},
    QuantityInfo{"dark_offset_dn", "DN", "mu_y.dark", "dark offset",
                 "Mean dark signal at the shortest exposure.", kEmva},
    QuantityInfo{"read_noise_dn", "DN", "sigma_d", "read noise",
                 "Root mean square temporal noise without light, quantization taken out.", kPtc},
    QuantityInfo{"read_noise_e", "e-", "sigma_d", "read noise",
                 "Root mean square temporal noise without light, in electrons.", kPtc},
    QuantityInfo{"saturation_dn", "DN", "mu_y.sat", "saturation",
                 "Signal at which 0.2 % of the pixels show the top code.", kEmva},
    QuantityInfo{"saturation_capacity_e", "e-", "mu_e.sat", "saturation capacity",
                 "Signal at saturation in electrons.", kEmva},
    QuantityInfo{"linearity_error_percent", "%", "LE", "linearity error",
                 "Mean relative deviation of the response from its line between 5 and 95 % of saturation.",
                 kEmva},
    QuantityInfo{"dsnu_dn", "DN", "DSNU", "dark signal non-uniformity",
                 "Spatial standard deviation of the noise-free dark frame.", kEmva},
    QuantityInfo{"dsnu_e", "e-", "DSNU", "dark signal non-uniformity",
                 "Spatial standard deviation of the noise-free dark frame, in electrons.", kEmva},
    QuantityInfo{"prnu_percent", "%", "PRNU", "photo response non-uniformity",
                 "Spatial standard deviation of the response, relative to the mean signal.", kEmva},
    QuantityInfo{"dark_current_dn_per_s", "DN/s", "mu_I", "dark current",
                 "Growth of the mean dark signal with exposure time.", kEmva},
    QuantityInfo{"dark_current_e_per_s", "e-/s", "mu_I", "dark current",
                 "Growth of the mean dark signal with exposure time, in electrons per pixel.", kEmva},
};

}  // namespace

std::span<const QuantityInfo> quantity_table() { return kTable; }

const QuantityInfo* find_quantity(std::string_view name) {
  const auto row =
      std::find_if(kTable.begin(), kTable.end(), [&](const auto& info) { return info.name == name; });
  return row == kTable.end() ? nullptr : &*row;
}

}  // namespace evenfield
