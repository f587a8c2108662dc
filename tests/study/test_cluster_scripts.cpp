// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"
#include "engine/study/external_program.hpp"
#include "engine/study/local_study.hpp"
#include "engine/study/slurm_script.hpp"
#include "engine/study/slurm_study.hpp"
#include "tests/study/study_samples.hpp"

#include <catch2/catch.hpp>

using namespace rille;
using namespace rille::engine;
using Catch::Contains;
using tests::StudyFolder;

namespace {

SlurmPaths paths() {
    return {"/opt/rille", "/data/it's 100 %/study", "/data/it's 100 %/study/slurm/0001"};
}

} // namespace

TEST_CASE("points are cut into tasks and arrays", "[slurm]") {
    Study study;
    study.slurm.points_per_task = 8;
    study.slurm.cpus_per_task = 4;
    study.slurm.seconds_per_point = 600;
    study.slurm.warn_before_kill_s = 120;
    const SlurmPlan plan = slurm_plan(study, 1000, 1, 100, 60);
    CHECK(plan.arrays == std::vector<std::size_t>{60, 60, 5}); // 125 tasks
    CHECK(plan.workers == 4);
    CHECK(plan.minutes == 2 * 10 + 3); // two points a worker, the warning, the start
    CHECK(plan.memory_mb == 700);      // 1.5 x 100 MB x 4 workers + 100 MB
    study.slurm.memory_mb = 3000;
    study.slurm.seconds_per_point.reset();
    const SlurmPlan estimated = slurm_plan(study, 1, 600, 100, 1001);
    CHECK(estimated.arrays == std::vector<std::size_t>{1});
    CHECK(estimated.memory_mb == 3000);
    CHECK(estimated.minutes == 2 * 30 + 3); // estimates have room for slower machines
    CHECK(slurm_plan(study, 0, 1, 1, 10).arrays.empty());
}

TEST_CASE("job scripts say what the study says", "[slurm]") {
    Study study;
    study.slurm.partition = "short";
    study.slurm.account = "etch";
    study.slurm.qos = "low";
    study.slurm.constraint = "avx2&ib";
    study.slurm.at_most_tasks = 60;
    study.slurm.points_per_task = 2;
    study.slurm.lines = {"module load gcc/12"};
    const SlurmPlan plan = slurm_plan(study, 9, 60, 100, 1001);
    const std::string text = slurm_array_script(study, plan, paths(), 7, 5);
    for (const char* words :
         {"#!/bin/bash\n", "#SBATCH --partition='short'\n", "#SBATCH --account='etch'\n",
          "#SBATCH --qos='low'\n", "#SBATCH --constraint='avx2&ib'\n", "#SBATCH --array=0-4%60\n",
          "#SBATCH --signal=B:TERM@120\n", "\nmodule load gcc/12\n", "it'\\''s 100 %/study' ",
          "100 %%/study/slurm/0001/task_%A_%a.log'", "$((7 + SLURM_ARRAY_TASK_ID))",
          "exec '/opt/rille' study-task"})
        CHECK_THAT(text, Contains(words));
    const std::string collect = slurm_collect_script(study, plan, paths());
    CHECK_THAT(collect,
               Contains("study-collect") && Contains("--account='etch'") && !Contains("--array"));
    study.slurm = {};
    study.slurm.warn_before_kill_s = 0;
    const std::string plain = slurm_array_script(study, plan, paths(), 0, 5);
    for (const char* words :
         {"--partition", "--account", "--qos", "--constraint", "--signal", "%1"})
        CHECK_THAT(plain, !Contains(words));
    CHECK_THAT(plain, Contains("--array=0-4\n"));
}

TEST_CASE("bash accepts the scripts", "[slurm]") {
    const StudyFolder folder;
    Study study;
    study.slurm.constraint = "a|b";
    const SlurmPlan plan = slurm_plan(study, 9, 60, 100, 1001);
    folder.write("good.sh", slurm_array_script(study, plan, paths(), 0, 9));
    CHECK(run_program({"bash", "-n", folder.path("good.sh")}).status == 0);
    SlurmPaths broken = paths();
    folder.write("bad.sh", slurm_array_script(study, plan, broken, 0, 9) + "'");
    CHECK(run_program({"bash", "-n", folder.path("bad.sh")}).status != 0);
}

TEST_CASE("a task does its part of the list", "[slurm]") {
    const StudyFolder folder;
    folder.write("points.txt", "3\n5\n8\n9\n12\n");
    CHECK(points_of_task(folder.path(""), 0, 2) == std::vector<std::size_t>{3, 5});
    CHECK(points_of_task(folder.path(""), 2, 2) == std::vector<std::size_t>{12});
    CHECK(points_of_task(folder.path(""), 3, 2).empty());
    CHECK_THROWS_AS(points_of_task(folder.path("none"), 0, 2), OutputError);
}

TEST_CASE("other programs are run with what they print and how they end", "[slurm]") {
    const ProgramEnd end = run_program({"sh", "-c", "echo out; echo err >&2; exit 3"});
    CHECK(end.status == 3);
    CHECK(end.output == "out\n");
    CHECK(end.errors == "err\n");
    CHECK(run_program({"/no/such/program"}).status == 127);
    CHECK(run_program({"sh", "-c", "kill -9 $$"}).status == 128 + 9);
    CHECK(run_program({"sh", "-c", "yes | head -c 300000"}).output.size() == 300000);
}

TEST_CASE("workers and threads fill the cores and no more", "[local]") {
    const auto both = [](int workers, int threads, int cores, std::size_t points) {
        const LocalSettings settings = local_settings(workers, threads, cores, points);
        return std::pair(settings.workers, settings.threads);
    };
    CHECK(both(0, 0, 8, 100) == std::pair(8, 1));
    CHECK(both(0, 2, 8, 100) == std::pair(4, 2));
    CHECK(both(2, 0, 8, 100) == std::pair(2, 4));
    CHECK(both(3, 3, 8, 100) == std::pair(3, 3)); // as asked
    CHECK(both(0, 0, 8, 3) == std::pair(3, 2));
    CHECK(both(0, 0, 8, 1) == std::pair(1, 8));
    CHECK(both(0, 16, 8, 5) == std::pair(1, 16));
    CHECK(both(0, 0, 0, 0) == std::pair(1, 1));
}
