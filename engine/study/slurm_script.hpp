// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/study/study.hpp"

#include <cstddef>
#include <string>
#include <vector>

namespace rille::engine {

/// How points are cut into the tasks of job arrays.
struct SlurmPlan {
    std::size_t points = 0;
    std::size_t points_per_task = 1;
    int workers = 1;      ///< of a task
    long minutes = 1;     ///< time limit of a task
    long memory_mb = 100; ///< of a task
    /// Tasks of each array: more than one array only where the cluster's arrays are too short.
    std::vector<std::size_t> arrays;
};

/// `seconds_per_point` and `memory_mb` (of one point) are the estimate's, used where the study
/// names none, with room for slower machines. `longest_array`: the cluster's MaxArraySize.
SlurmPlan slurm_plan(const Study&, std::size_t points, double seconds_per_point, double memory_mb,
                     std::size_t longest_array);

/// Where a job finds things: all paths absolute and on a file system that the nodes share.
struct SlurmPaths {
    std::string program; ///< of rille
    std::string folder;  ///< of the study
    std::string round;   ///< folder of this round of submission, below the study's
};

/// The script of one array of tasks. Task t of the array does the points on the lines from
/// (first_task + t) * points_per_task on of round/points.txt.
std::string slurm_array_script(const Study&, const SlurmPlan&, const SlurmPaths&,
                               std::size_t first_task, std::size_t tasks);
/// The script of the job that puts the results together after all tasks.
std::string slurm_collect_script(const Study&, const SlurmPlan&, const SlurmPaths&);

} // namespace rille::engine
