#pragma once

#include "harness/base/file.h"

#include <filesystem>
#include <memory>
#include <span>
#include <string>
#include <vector>

namespace input {

/// An array in a NumPy file: its header checked against the bytes that are there, its items still
/// in the file. Cheap to copy; may be read by several threads at once.
struct NpyArray {
  std::shared_ptr<const base::FileReader> file;
  std::vector<std::size_t> shape;
  std::size_t items = 0;      ///< product of `shape`
  char kind = 'f';            ///< f: floating point, i: signed integer, u: unsigned integer
  std::size_t item_size = 8;  ///< bytes
  std::size_t data = 0;       ///< offset of the first item
};

/// Whether a file begins as every .npy does. Throws base::InputError when it cannot be read.
bool is_npy(const std::filesystem::path& path, const std::string& shown);

enum class NpyItems { Real, Double, Integer };

/// Opens a .npy of format 1.0 or 2.0 in C order. Items: <f4 or <f8 (Real), <f8 (Double), or
/// integers of 1 to 8 bytes, little-endian (Integer). Throws base::InputError otherwise.
/// Source: NumPy Enhancement Proposal 1, "A simple file format for NumPy arrays".
NpyArray open_npy(const std::filesystem::path& path, const std::string& shown, NpyItems items);

/// Items `first` and following, in C order; integers beyond 2^53 are rounded.
/// Precondition: first + out.size() <= array.items.
void read_items(const NpyArray& array, std::size_t first, std::span<double> out);

/// "(60, 24, 4, 4)", as in Python.
std::string shape_text(std::span<const std::size_t> shape);

}  // namespace input
