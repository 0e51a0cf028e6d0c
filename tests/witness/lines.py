"""Fits of variance against signal and of signal against exposure (METHODS 3, 4, 6, 7), by iteration and by scipy."""
import numpy
from scipy import optimize


def weighted_line(x, y, weights):
    """Intercept and slope of the weighted straight line."""
    x, y, root = numpy.asarray(x, float), numpy.asarray(y, float), numpy.sqrt(numpy.asarray(weights, float))
    if numpy.ptp(x) == 0:
        return float(numpy.average(y, weights=root ** 2)), 0.0
    design = numpy.stack([root, root * x], axis=1)
    (intercept, slope), *_ = numpy.linalg.lstsq(design, root * y, rcond=None)
    return float(intercept), float(slope)


def likelihood_line(x, variance, freedom):
    """Intercept and slope of maximum likelihood: weights nu / (2 m^2) of the model m, iterated to rest (METHODS 7.1)."""
    x, variance, freedom = (numpy.asarray(a, float) for a in (x, variance, freedom))
    model = numpy.maximum(variance, 1e-12)
    previous = (0.0, 0.0)
    for _ in range(500):
        line = weighted_line(x, variance, freedom / (2 * model ** 2))
        if numpy.allclose(line, previous, rtol=1e-13, atol=0):
            break
        previous = line
        model = numpy.maximum(line[0] + line[1] * x, 1e-12)
    return line


def curve(x, intercept, gain, curvature):
    """V = b + K^2 / (2 a) (exp(2 a x / K) - 1), METHODS 7.4; its limit is the line."""
    exponent = 2 * curvature * x / gain
    growth = numpy.where(numpy.abs(exponent) < 1e-12, 1.0, numpy.expm1(exponent) / numpy.where(exponent == 0, 1.0, exponent))
    return intercept + gain * x * growth


def likelihood_curve(x, variance, freedom):
    """Intercept, gain, curvature [1/e-] and the curvature's standard error; model weights as in the line."""
    x, variance, freedom = (numpy.asarray(a, float) for a in (x, variance, freedom))
    intercept, gain = likelihood_line(x, variance, freedom)
    start = numpy.array([intercept, gain, 0.0])
    unit = numpy.array([max(abs(intercept), 1e-6), gain, gain / numpy.max(x)])
    at = start / unit
    for _ in range(200):
        weights = numpy.sqrt(freedom / 2) / curve(x, *(at * unit))
        found = optimize.least_squares(lambda p, w=weights: w * (variance - curve(x, *(p * unit))), at, xtol=1e-15, ftol=1e-15,
                                       gtol=1e-15)
        step, at = numpy.max(numpy.abs(found.x - at)), found.x
        if step < 1e-12:
            break
    errors = numpy.sqrt(numpy.diag(numpy.linalg.inv(found.jac.T @ found.jac))) * unit
    intercept, gain, curvature = at * unit
    return float(intercept), float(gain), float(curvature), float(errors[2])


def origin_slope(x, y):
    x, y = numpy.asarray(x, float), numpy.asarray(y, float)
    return float(numpy.sum(x * y) / numpy.sum(x * x))
