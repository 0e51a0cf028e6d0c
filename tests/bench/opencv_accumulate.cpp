/// Mean and temporal variance of each TIFF stack, as a user of OpenCV does it frame by frame: libtiff reads,
/// accumulate and accumulateSquare add.
///   opencv_accumulate float|double FILE...
/// Float accumulators are the faster ones, but their 24 bits are too few for the variance of bright 16-bit
/// frames; double ones give it. Prints a line for each file: mean [DN], variance [DN^2].

#include <cstdio>
#include <cstring>
#include <exception>
#include <opencv2/core.hpp>
#include <opencv2/imgproc.hpp>

#include "tiff_frames.h"

int main(int argc, char** argv) {
  const bool is_float = argc > 1 && std::strcmp(argv[1], "float") == 0;
  if (!is_float && (argc < 2 || std::strcmp(argv[1], "double") != 0)) {
    std::fprintf(stderr, "opencv_accumulate: found %s, expected float or double and then files\n",
                 argc < 2 ? "nothing" : argv[1]);
    return 2;
  }
  const int accumulator = is_float ? CV_32FC1 : CV_64FC1;
  try {
    TiffFrame frame;
    for (int i = 2; i < argc; ++i) {
      cv::Mat sum;
      cv::Mat square;
      int frames = 0;
      for_each_tiff_frame(argv[i], frame, [&](TiffFrame& read) {
        const cv::Mat image(static_cast<int>(read.height), static_cast<int>(read.width), CV_16UC1,
                            read.pixels.data());
        if (frames == 0) {
          sum = cv::Mat::zeros(image.size(), accumulator);
          square = cv::Mat::zeros(image.size(), accumulator);
        }
        cv::accumulate(image, sum);
        cv::accumulateSquare(image, square);
        ++frames;
      });
      const cv::Mat spread = square - sum.mul(sum, 1.0 / frames);
      std::printf("%.4f %.4f\n", cv::mean(sum)[0] / frames,
                  cv::mean(spread)[0] / (frames > 1 ? frames - 1 : 1));
    }
  } catch (const std::exception& error) {
    std::fprintf(stderr, "%s\n", error.what());
    return 3;
  }
  return 0;
}
