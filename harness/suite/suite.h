#pragma once

#include "harness/model/suite.h"

#include <filesystem>
#include <span>
#include <string>

namespace suite {

/// Reads a suite and everything it uses, checks all of it and expands its cases.
/// `skinnings`: the methods of this build. Throws base::InputError with every wrong place found.
model::Suite load_suite(const std::filesystem::path& path,
                        std::span<const model::SkinningSpec> skinnings);

/// Root folder of a suite file: the nearest ancestor with an empty file `skinfold.root`, else the
/// parent of a folder `suites` that holds the suite, else the suite's own folder.
std::filesystem::path root_folder(const std::filesystem::path& suite_file);

}  // namespace suite
