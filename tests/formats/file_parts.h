#pragma once
/// TIFF and FITS files put together byte by byte, by no library, so that a test can make what no writer
/// would.

#include <zlib.h>

#include <cstdint>
#include <string>
#include <utility>
#include <vector>

#include "frames_on_disk.h"

namespace evenfield {

/// `bytes` bytes of `value`, last byte first if `big_endian`.
inline void put(Bytes& out, std::uint64_t value, int bytes, bool big_endian = false) {
  for (int i = 0; i < bytes; ++i) {
    const int shift = 8 * (big_endian ? bytes - 1 - i : i);
    out.push_back(static_cast<char>((value >> static_cast<unsigned>(shift)) & 0xFFU));
  }
}

/// One tag of a TIFF directory with a single value.  TIFF 6.0, section 2: type 3 is 16 bit, type 4 is 32 bit.
struct TiffTag {
  unsigned tag;
  unsigned type;
  std::uint32_t value;
};

/// A TIFF file of one 4 x 2 page of 16 bit, whose pixels are at byte 8 and whose directory follows them.
struct SmallTiff {
  std::vector<TiffTag> tags{{256, 3, 4}, {257, 3, 2}, {258, 3, 16}, {259, 3, 1}, {262, 3, 1},
                            {273, 4, 8}, {277, 3, 1}, {278, 3, 2},  {279, 4, 16}};
  Bytes pixels{1, 0, 2, 0, 3, 0, 4, 0, 0, 1, 0, 2, 0, 3, 0, 4};  // 1, 2, 3, 4 and 256, 512, 768, 1024
  std::uint32_t next_directory = 0;

  SmallTiff& set(unsigned tag, unsigned type, std::uint32_t value) {
    for (TiffTag& old : tags) {
      if (old.tag == tag) {
        old = {tag, type, value};
        return *this;
      }
    }
    const auto after =
        std::find_if(tags.begin(), tags.end(), [tag](const TiffTag& t) { return t.tag > tag; });
    tags.insert(after, {tag, type, value});
    return *this;
  }
  SmallTiff& remove(unsigned tag) {
    std::erase_if(tags, [tag](const TiffTag& t) { return t.tag == tag; });
    return *this;
  }
  Bytes bytes() const {
    Bytes out{'I', 'I', 42, 0};
    put(out, 8 + pixels.size(), 4);
    out.insert(out.end(), pixels.begin(), pixels.end());
    put(out, tags.size(), 2);
    for (const TiffTag& tag : tags) {
      put(out, tag.tag, 2);
      put(out, tag.type, 2);
      put(out, 1, 4);
      put(out, tag.value, 4);
    }
    put(out, next_directory, 4);
    return out;
  }
};

/// A FITS header of these cards, END and padding added.
inline Bytes fits_header(const std::vector<std::string>& cards) {
  std::string text;
  for (std::string card : cards) {
    card.resize(80, ' ');
    text += card;
  }
  text += "END";
  text.resize((text.size() + 2879) / 2880 * 2880, ' ');
  return {text.begin(), text.end()};
}

/// Cards of a primary image and further ones behind them.
inline std::vector<std::string> image_cards(int bits,
                                            const std::vector<std::string>& axes,
                                            const std::vector<std::string>& more = {}) {
  std::vector<std::string> cards{"SIMPLE  =                    T", "BITPIX  = " + std::to_string(bits),
                                 "NAXIS   = " + std::to_string(axes.size())};
  for (std::size_t i = 0; i < axes.size(); ++i)
    cards.push_back("NAXIS" + std::to_string(i + 1) + "  = " + axes[i]);
  cards.insert(cards.end(), more.begin(), more.end());
  return cards;
}

inline Bytes joined(Bytes first, const Bytes& second) {
  first.insert(first.end(), second.begin(), second.end());
  return first;
}

inline Bytes padded(Bytes data) {
  data.resize((data.size() + 2879) / 2880 * 2880);
  return data;
}

/// `bytes` as a gzip file.
inline Bytes gzipped(const Bytes& bytes, int level = 6) {
  z_stream state{};
  deflateInit2(&state, level, Z_DEFLATED, 15 + 16, 8, Z_DEFAULT_STRATEGY);
  Bytes out(deflateBound(&state, bytes.size()) + 64);
  Bytes in = bytes;
  state.next_in = reinterpret_cast<Bytef*>(in.data());
  state.avail_in = static_cast<uInt>(in.size());
  state.next_out = reinterpret_cast<Bytef*>(out.data());
  state.avail_out = static_cast<uInt>(out.size());
  deflate(&state, Z_FINISH);
  out.erase(out.end() - static_cast<std::ptrdiff_t>(state.avail_out), out.end());
  deflateEnd(&state);
  return out;
}

}  // namespace evenfield
