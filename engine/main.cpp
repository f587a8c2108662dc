// SPDX-License-Identifier: Apache-2.0
#include "engine/caution.hpp"
#include "engine/commands.hpp"
#include "engine/output_folder.hpp"
#include "engine/problems.hpp"
#include "engine/version.hpp"
#include "engine/words.hpp"
#include "geometry/check.hpp"
#include "geometry/keep_memory.hpp"

#include <CLI/CLI.hpp>
#include <csignal>
#include <iostream>
#include <tbb/global_control.h>
#include <unistd.h>

namespace {

using namespace rille;

std::atomic<bool> stop{false};
volatile std::sig_atomic_t signal_number = 0;
volatile std::sig_atomic_t quiet = 0;

void on_signal(int number) {
    if (stop) std::_Exit(128 + number); // asked twice: the files written so far are whole
    signal_number = number;
    stop = true;
    constexpr char stopping[] = "\nstopping after this refresh; once more to stop at once\n";
    if (!quiet && write(STDERR_FILENO, stopping, sizeof stopping - 1) < 0) quiet = 1;
}

void add_overrides(CLI::App& command, engine::CommonOptions& options) {
    command
        .add_option("--set", options.overrides,
                    "Replace a value of the case, for example mask.openings.trench.cd='70 nm'; "
                    "may be given several times")
        ->type_name("KEY=VALUE")
        ->allow_extra_args(false);
}

void add_common(CLI::App& command, engine::CommonOptions& options) {
    command.add_option("--threads", options.threads, "Threads to use (default: all cores)")
        ->check(CLI::Range(1, 4096).description(""))
        ->type_name("N");
    command.add_flag("--json", options.json, "Print the result as JSON");
}

void add_seed(CLI::App& command, engine::CommonOptions& options) {
    command
        .add_option("--seed", options.seed, "Seed of everything random, instead of sampling.seed")
        ->check(CLI::Validator(
            [](const std::string& text) {
                const bool digits = text.find_first_not_of("0123456789") == std::string::npos;
                return digits ? std::string() : text + " is not a whole number from 0";
            },
            ""))
        ->type_name("N");
}

/// `rille study`, and what it lets other processes of this program do.
struct StudyCommands {
    CLI::App *study = nullptr, *worker = nullptr, *task = nullptr, *collect = nullptr;
    engine::StudyOptions options;
    engine::StudyTask job;

    void add(CLI::App& app) {
        study = app.add_subcommand("study", "Run a case many times with values changed, and put "
                                            "the results together; the same command goes on after "
                                            "a stop");
        worker = app.add_subcommand("study-worker", "Run points of a study for another process");
        task = app.add_subcommand("study-task", "Run the points of one task of a job array");
        collect = app.add_subcommand("study-collect", "Look after a job array that has ended");
    }
    void add_words(std::string& path, std::string& folder) {
        study->add_option("study", path, "Study file (YAML)")->type_name("FILE")->required();
        study->add_option("-o", options.folder, "Folder for the results")
            ->type_name("DIR")
            ->capture_default_str();
        add_ways();
        study->footer("Exit status: 0 every point has a result (not cleared and clogged are "
                      "results), 4 points failed, were\nkilled or are missing, 130 or 143 stopped; "
                      "the others as of every command.\n" +
                      std::string(engine::caution));
        for (CLI::App* command : {worker, task, collect}) {
            command->add_option("folder", folder)->required();
            command->group(""); // for the program itself
        }
        for (CLI::App* command : {task, collect})
            command->add_option("round", job.round)->required();
        task->add_option("task", job.task)->required();
        task->add_option("--points-per-task", job.points_per_task)->check(CLI::PositiveNumber);
        task->add_option("--workers", job.workers)->check(CLI::PositiveNumber);
    }
    bool is_asked() const { return *study || *task || *collect; }
    int go(const std::string& path, const std::string& folder,
           const engine::CommonOptions& common) const {
        std::signal(SIGPIPE, SIG_IGN); // a worker that dies is heard of by its end
        if (*collect) return engine::study_collect_command(folder, job.round);
        if (*task) return engine::study_task_command(folder, job, common, stop);
        return engine::study_command(path, options, common, stop);
    }

private:
    void add_ways() {
        study
            ->add_option("--workers", options.workers,
                         "Points to run at once (default: as many as there are cores)")
            ->check(CLI::Range(1, 4096).description(""))
            ->type_name("N");
        study->add_flag("--plan", options.plan_only,
                        "Show the plan and what it costs; run nothing");
        study->add_flag("--slurm", options.slurm,
                        "Hand the missing points to the Slurm cluster of this machine");
        study->add_flag("--collect", options.collect,
                        "Only put together the points that are there");
        study->add_option("--retry", options.retry, "Do points again that are failed or killed")
            ->check(CLI::IsMember({"failed", "killed"}))
            ->type_name("STATUS")
            ->allow_extra_args(false);
        study->add_flag("--force", options.force, "Remove an earlier study from the folder first");
    }
};

/// The terminal tells every process of Ctrl-C; who started a worker decides.
int work_on_study(const std::string& folder, const engine::CommonOptions& options) {
    quiet = 1;
    std::signal(SIGINT, SIG_IGN);
    std::signal(SIGTERM, on_signal);
    std::signal(SIGPIPE, SIG_IGN);
    return engine::study_worker_command(folder, std::max(1, options.threads), stop);
}

/// What is wrong with the words of the command line where a command or an option is unknown; else
/// empty.
std::string slip_in(const CLI::App& app, int argc, char** argv) {
    std::vector<std::string> commands;
    const std::string first = argc > 1 ? argv[1] : "-";
    const CLI::App* command = nullptr;
    for (const CLI::App* one : app.get_subcommands({})) {
        if (!one->get_group().empty()) commands.push_back(one->get_name());
        if (one->get_name() == first) command = one;
    }
    if (first[0] != '-' && !command)
        return "unknown command " + engine::quoted(first) +
               "; there are: " + engine::listed(commands) + engine::did_you_mean(first, commands);
    std::vector<std::string> names;
    for (const CLI::Option* option : (command ? command : &app)->get_options())
        if (option->nonpositional()) names.push_back(option->get_name());
    for (const std::string& word : app.remaining(true))
        if (word[0] == '-' && word.size() > 1)
            return "unknown option " + engine::quoted(word) +
                   (command ? " of rille " + first : std::string()) +
                   engine::did_you_mean(word, names);
    return "";
}

int dispatch(int argc, char** argv) {
    CLI::App app("rille: the profile that a plasma etch leaves in a film stack");
    app.footer(
        std::string("Exit status: 0 done, 1 internal error, 2 usage, 3 bad input, 4 numerics, 5 "
                    "file, 6 a required target is not met, 130 or 143 interrupted\nwith valid "
                    "output. A film that did not clear is "
                    "a result (0), unless its step says must_end.\n\n") +
        engine::caution);
    app.set_version_flag("--version", "rille " + engine::version() + " (" + engine::revision() +
                                          ", " + engine::build_info() + ")");
    app.require_subcommand(1);
    engine::CommonOptions options;
    for (int i = 0; i < argc; ++i)
        options.command_line += (i ? " " : "") + std::string(argv[i]);
    std::string path, folder = "out";
    bool force = false;
    auto* run = app.add_subcommand("run", "Etch a case and write the result into a folder; Ctrl-C "
                                          "stops it, leaves what it has, and resume goes on");
    auto* resume = app.add_subcommand("resume", "Take up a run that was stopped; the result is the "
                                                "same as without the stop");
    auto* check = app.add_subcommand("check", "Read a case, show it in full and what it will cost");
    std::string sheath_folder;
    auto* sheath = app.add_subcommand(
        "sheath", "Show what reaches the wafer: energies, angles and fluxes of the ions");
    auto* measure = app.add_subcommand("measure", "Measure a finished run again");
    StudyCommands studies;
    studies.add(app);
    std::vector<std::string> folders;
    std::string place = "comparison";
    bool figures = false;
    auto* report = app.add_subcommand("report", "Write the report of a run or a study again, or "
                                                "show several runs side by side: one HTML file");
    auto* schema = app.add_subcommand("schema", "Print the JSON Schema of a case file");
    bool of_study = false;
    schema->add_flag("--study", of_study, "Of a study file instead");
    run->add_option("case", path, "Case file (YAML)")->type_name("FILE")->required();
    run->add_option("-o", folder, "Folder for the result")->type_name("DIR")->capture_default_str();
    run->add_flag("--force", force, "Replace what an earlier run left in the folder");
    run->footer(engine::caution);
    check->add_option("case", path, "Case file (YAML)")->type_name("FILE")->required();
    sheath->add_option("case", path, "Case file (YAML)")->type_name("FILE")->required();
    sheath->add_option("-o", sheath_folder, "Folder for tables (CSV) and picture; default: none")
        ->type_name("DIR");
    sheath->add_flag("--force", force, "Replace what an earlier command left in the folder");
    sheath->footer("Voltages are those of a model, not permitted settings of a tool.\n" +
                   std::string(engine::caution));
    resume->add_option("folder", folder, "Folder of the run")->type_name("DIR")->required();
    resume->footer(engine::caution);
    measure->add_option("folder", folder, "Folder of a run")->type_name("DIR")->required();
    studies.add_words(path, folder);
    report->add_option("folder", folders, "Folder of a run or a study; several runs: side by side")
        ->type_name("DIR")
        ->required();
    report->add_option("-o", place, "Folder for the report on several runs")
        ->type_name("DIR")
        ->capture_default_str();
    report->add_flag(
        "--figures", figures,
        "Write each figure as SVG and as PNG of 1920 x 1080 into the folder figures too");
    report->footer(engine::caution);
    for (CLI::App* command : {run, check, sheath, measure, studies.study})
        add_overrides(*command, options);
    for (CLI::App* command :
         {run, resume, check, sheath, measure, studies.study, studies.worker, studies.task})
        add_common(*command, options);
    for (CLI::App* command : {run, sheath})
        add_seed(*command, options);
    for (CLI::App* command : {run, resume, studies.study})
        command->add_flag("--require-targets", options.require_targets,
                          "Exit with 6 unless every target is met; undecided is not met");
    for (CLI::App* command : {run, resume, sheath, report, studies.study})
        command->add_flag("--quiet", options.quiet, "Print nothing but errors");
    try {
        app.parse(argc, argv);
    } catch (const CLI::ParseError& error) {
        const std::string slip = error.get_exit_code() == 0 ? "" : slip_in(app, argc, argv);
        if (slip.empty()) return app.exit(error) == 0 ? 0 : 2;
        std::cerr << slip << "\nRun with --help for more information.\n";
        return 2;
    }
    if (*studies.worker) return work_on_study(folder, options);
    std::optional<tbb::global_control> limit;
    if (options.threads > 0)
        limit.emplace(tbb::global_control::max_allowed_parallelism, options.threads);
    if (*check) return engine::check_command(path, options);
    if (*sheath) return engine::sheath_command(path, sheath_folder, force, options);
    if (*measure) return engine::measure_command(folder, options);
    if (*report) return engine::report_command(folders, place, figures, options);
    if (*schema) return engine::schema_command(of_study);
    quiet = options.quiet;
    std::signal(SIGINT, on_signal);
    std::signal(SIGTERM, on_signal);
    const int status = studies.is_asked() ? studies.go(path, folder, options)
                       : *resume          ? engine::resume_command(folder, options, stop)
                                          : engine::run_command(path, folder, force, options, stop);
    return status == engine::interrupted_status ? 128 + signal_number : status;
}

} // namespace

int main(int argc, char** argv) {
    geometry::keep_freed_memory();
    try {
        return dispatch(argc, argv);
    } catch (const engine::InputError& error) {
        std::cerr << error.what() << '\n';
        return 3;
    } catch (const NumericsError& error) {
        std::cerr << "numerics: " << error.what() << '\n';
        return 4;
    } catch (const engine::OutputError& error) {
        std::cerr << "file: " << error.what() << '\n';
        return 5;
    } catch (const std::exception& error) {
        std::cerr << "internal error: " << error.what() << '\n';
        return 1;
    }
}
