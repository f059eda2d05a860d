// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace rillstrand::app {

/// The output folder of one run. Files are written into a staging folder inside it and put in
/// place together at the end, each by a rename, so that nobody ever sees half a file; a run that
/// fails or is killed leaves the earlier output as it was. A second run on the same folder at the
/// same time is refused; the lock belongs to the process and goes with it.
class Output {
public:
    /// Makes the folder if it is missing, takes the lock, finishes or clears what a killed run
    /// left.
    /// @throws DataError     if the folder is in use by another run or leads outside by a link
    /// @throws MachineError  if the folder cannot be made or written
    explicit Output(std::filesystem::path folder);
    Output(const Output&) = delete;
    Output& operator=(const Output&) = delete;
    Output(Output&&) = delete;
    Output& operator=(Output&&) = delete;
    ~Output();

    const std::filesystem::path& folder() const { return m_folder; }
    /// Where files are written before they are put in place; same tree as the output folder.
    const std::filesystem::path& staging() const { return m_staging; }
    /// Writes one text or binary file into the staging folder.
    /// @param name  relative, e.g. `tables/inflows.csv`
    void write(const std::filesystem::path& name, const std::string& content) const;
    /// Puts every staged file in place: all are flushed to disk, the list is written down, then
    /// each is renamed. A list that was written down is carried out by the next run if this one
    /// is killed in between.
    /// @return the relative names, sorted
    std::vector<std::filesystem::path> commit();

private:
    void carry_out_pending() const;
    void clear_left_over() const;
    std::filesystem::path m_folder;
    std::filesystem::path m_staging;
    int m_lock = -1;
};

} // namespace rillstrand::app
