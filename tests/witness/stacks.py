"""What one stack of frames of one region says: means, temporal variance, spatial variance and its parts. Whole frames,
float64, straight from the definitions (METHODS 1.2, 5.1 to 5.3)."""
import numpy
from scipy import optimize, stats

HIT_SIGMAS = 8.0
HIGHPASS_BORDER = 9
HIGHPASS_LINE_GAIN = 0.8890622  # METHODS 5.3: of a pattern of columns or rows only
HIGHPASS_NOISE_GAIN = 0.9884951081  # METHODS 5.3, check SP-05: what the filter leaves of the variance of white noise


def box(size):
    return numpy.full(size, 1.0 / size)


def low_pass_kernel():
    """7 box, 11 box, 3 binomial, one dimension; the filter is the same along rows and columns."""
    return numpy.convolve(numpy.convolve(box(7), box(11)), [0.25, 0.5, 0.25])


def high_pass(image):
    """Image less its low-pass, on the interior where no border enters."""
    kernel, border = low_pass_kernel(), HIGHPASS_BORDER
    height, width = image.shape
    along = sum(weight * image[:, i:width - 2 * border + i] for i, weight in enumerate(kernel))
    both = sum(weight * along[i:height - 2 * border + i] for i, weight in enumerate(kernel))
    return image[border:-border, border:-border] - both


def scales_of(frames, dark_level):
    """One scale per frame: the ratio of its signal to the mean signal (INTERFACE, Scale drift)."""
    signals = frames.mean(axis=(1, 2)) - dark_level
    return signals / signals.mean()


def without_hits(frames, most_dn_per_e):
    """The frames with every sample that stands far above the other frames of its pixel replaced by their mean, and how many.
    The sum of squares about a pixel's mean is then that of its other frames alone. `most_dn_per_e` is a bound of the gain:
    a pixel of much dark current has photon noise of its own."""
    count = len(frames)
    others = (frames.sum(axis=0) - frames) / (count - 1)
    excess = frames - others
    common = numpy.median(excess, axis=(1, 2), keepdims=True)
    excess = excess - common
    spread = (1.482602 * numpy.median(numpy.abs(excess))) ** 2
    own = (1 + 1 / (count - 1)) * most_dn_per_e * numpy.clip(others - numpy.median(frames), 0, None)
    hits = excess > HIT_SIGMAS * numpy.sqrt(spread + own)
    return numpy.where(hits, others + common, frames), int(hits.sum())


def temporal_variance(frames, hits, dark_level=None):
    """Variance over frames, pooled over pixels, unbiased; `hits` samples hold no information. Darks (no dark_level): frame
    means subtracted. Flats: every frame brought to the common signal, where the photon noise of frame f is 1/scale of the common
    one; so it counts with the weight scale, and nothing remains to be divided out. (Equal weights and a division by the mean of
    1/scale estimate the same and differ by a few hundredths of its standard uncertainty at 1 % drift; the pages allow both.)"""
    if dark_level is None:
        even, weights = frames - frames.mean(axis=(1, 2), keepdims=True), numpy.ones(len(frames))
    else:
        weights = scales_of(frames, dark_level)
        even = (frames - dark_level) / weights[:, None, None]
    center = numpy.average(even, axis=0, weights=weights)
    squares = sum(weight * numpy.sum((frame - center) ** 2) for weight, frame in zip(weights, even))
    return squares / ((frames[0].size - 1) * (len(frames) - 1) - hits)


def variance_map(frames):
    """Of each pixel over frames, frame means subtracted, dof F - 1 and n/(n-1) for the means."""
    even = frames - frames.mean(axis=(1, 2), keepdims=True)
    pixels = frames[0].size
    return even.var(axis=0, ddof=1) * pixels / (pixels - 1)


def row_column_pixel(image):
    """Squares of the row, column and pixel parts of an image, its noise in the last: two-way random effects, exactly unbiased
    (METHODS 5.2)."""
    rows, columns = image.shape
    mean = image.mean()
    row_means, column_means = image.mean(axis=1), image.mean(axis=0)
    residual = image - row_means[:, None] - column_means[None, :] + mean
    square_rows = columns * numpy.sum((row_means - mean) ** 2) / (rows - 1)
    square_columns = rows * numpy.sum((column_means - mean) ** 2) / (columns - 1)
    pixel = numpy.sum(residual ** 2) / ((rows - 1) * (columns - 1))
    return (square_rows - pixel) / columns, (square_columns - pixel) / rows, pixel


def row_and_pixel_noise(frames):
    """Squares of the temporal noise that a row shares and of what is left to pixels: all consecutive pairs pooled."""
    rows, columns = frames.shape[1:]
    row_squares, pixel_squares = [], []
    for first, second in zip(frames[:-1], frames[1:]):
        difference = first - second
        row_means = difference.mean(axis=1)
        pixel = numpy.sum((difference - row_means[:, None]) ** 2) / (2 * rows * (columns - 1))
        row_squares.append(row_means.var(ddof=1) / 2 - pixel / columns)
        pixel_squares.append(pixel)
    return numpy.mean(row_squares), numpy.mean(pixel_squares)


def spatial_parts(frames, variance, row_noise):
    """Squares of total, row, column, pixel and high-pass non-uniformity of the noise-free frame, from the average of a stack of
    temporal variance `variance`, of which pixels of a row share `row_noise`. The total is that of the pixels at hand, 1/n
    (METHODS 5.1); the parts are taken before filtering. Shared noise stays in the row means of the average: it leaves that part."""
    image, count = frames.mean(axis=0), len(frames)
    row, column, pixel = row_column_pixel(image)
    return {"": image.var() - variance / count, "row_": row - row_noise / count, "column_": column,
            "pixel_": pixel - (variance - row_noise) / count,
            # Row noise passes the filter as a pattern of lines does (METHODS 5.3), all other noise as white.
            "highpass_": (high_pass(image).var() - ((variance - row_noise) * HIGHPASS_NOISE_GAIN + row_noise * HIGHPASS_LINE_GAIN) / count)
                         / HIGHPASS_NOISE_GAIN}


def neighbour_covariances(frames, dark_level=None):
    """Sum of the covariances with the eight neighbours, from half the difference of the first two frames."""
    pair, growth = frames[:2], 1.0
    if dark_level is not None:
        scales = scales_of(pair, dark_level)
        pair, growth = (pair - dark_level) / scales[:, None, None], numpy.mean(1 / scales)
    difference = pair[0] - pair[1]
    difference = difference - difference.mean()
    height, width = difference.shape

    def covariance(down, right):
        return numpy.mean(difference[:height - down, :width - right] * difference[down:, right:]) / 2 / growth

    down_left = numpy.mean(difference[:-1, 1:] * difference[1:, :-1]) / 2 / growth
    return 2 * (covariance(0, 1) + covariance(1, 0) + covariance(1, 1) + down_left)


def median_of_true_deviations(variances, count):
    """Median over the pixels of the true standard deviation, if these are distributed log-normally: the distribution whose sample
    deviations in `count` frames have the median and the quartiles that were found, by quadrature over the population."""
    found = numpy.quantile(numpy.log(variances[variances > 0]) / 2, [0.25, 0.5, 0.75])
    nodes, weights = numpy.polynomial.hermite_e.hermegauss(60)
    weights = weights / weights.sum()

    def quantile(share, spread):
        def below(x):
            return weights @ stats.chi2.cdf((count - 1) * numpy.exp(2 * (x - spread * nodes)), count - 1) - share
        return optimize.brentq(below, -6 - 6 * spread, 6 + 6 * spread)

    def excess(spread):
        return quantile(0.75, spread) - quantile(0.25, spread) - (found[2] - found[0])
    spread = optimize.brentq(excess, 0, 3) if excess(0) < 0 else 0.0
    return numpy.exp(found[1] - quantile(0.5, spread))
