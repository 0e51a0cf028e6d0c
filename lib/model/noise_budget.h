#pragma once
/// Signal-to-noise ratio, detection threshold and dynamic range. Signals and noises in electrons;
/// `dark_noise_e` is the temporal noise in the dark with quantization, sigma_y.dark / K. Source: EMVA 1288
/// chapter 2 (from memory), METHODS 3.2.

namespace evenfield {

/// sigma_y.dark [DN] = sqrt(K^2 r^2 + q), r the read noise without quantization, q its variance [DN^2].
double dark_noise_dn(double gain_dn_per_e, double read_noise_e, double quantization_dn2);

/// S / sqrt(d^2 + S), and with the fixed pattern S / sqrt(d^2 + S + DSNU^2 + PRNU^2 S^2), PRNU as a fraction.
double signal_to_noise(double signal_e, double dark_noise_e);
double total_signal_to_noise(double signal_e, double dark_noise_e, double dsnu_e, double prnu);

/// Signal of ratio 1 [e-]: d + 1/2 as the standard prints it, and exactly sqrt(d^2 + 1/4) + 1/2.
/// In photons: divide by the quantum efficiency.
double threshold_e(double dark_noise_e);
double exact_threshold_e(double dark_noise_e);

/// Saturation capacity over threshold_e(): not full well over read noise.
double dynamic_range(double saturation_e, double dark_noise_e);
/// Relative statistical uncertainty of that, from the relative uncertainty of the saturation signal in DN and
/// that of sigma_y.dark: both in DN, so that the gain enters through the half electron only.
double dynamic_range_relative_uncertainty(double saturation_relative_uncertainty,
                                          double dark_noise_relative_uncertainty,
                                          double dark_noise_e);

/// sqrt(saturation capacity).
double maximum_signal_to_noise(double saturation_e);

double decibels(double ratio);                            ///< 20 log10
double decibel_uncertainty(double relative_uncertainty);  ///< 20 / ln 10 x u_rel
double bits(double ratio);                                ///< log2

}  // namespace evenfield
