// SPDX-License-Identifier: Apache-2.0
// The state of a simulation as text and back. Everything that the next step depends on is kept, or
// is found again bit for bit from what is kept: the surface from the front, the arrivals by the
// solve that gave them.
#include "engine/simulation.hpp"
#include "engine/state_archive.hpp"

#include <sstream>

namespace rille::engine {

template <class Archive, class Self>
void Simulation::visit(Archive& archive, Self& self) {
    archive(self.films_.material);
    archive(self.films_.thickness);
    for (auto& error : self.displacement_errors_)
        archive(error);
    self.bases_.visit(archive, self.bases_);
    self.open_field_.visit(archive, self.open_field_);
    self.ledger_.visit(archive, self.ledger_);
    archive(self.duration_s_);
    archive(self.time_s_);
    archive(self.last_dt_s_);
    archive(self.last_move_cells_);
    archive(self.step_start_s_);
    archive(self.start_distance_);
    archive(self.neck_limit_s_);
    archive(self.pace_);
    archive(self.step_index_);
    archive(self.plasma_step_);
    archive(self.all_reached_);
    archive(self.timings_);
}

namespace {

template <class Archive, class Outcome>
void visit_outcome(Archive& archive, Outcome& step) {
    archive(step.name);
    archive(step.start_s);
    archive(step.end_s);
    archive(step.reason);
}

template <class Archive, class Event>
void visit_event(Archive& archive, Event& event) {
    archive(event.part.kind);
    archive(event.part.centre.x);
    archive(event.part.centre.y);
    archive(event.part.centre.z);
    archive(event.part.volume);
    archive(event.part.chain);
    archive(event.time_s);
}

} // namespace

std::string Simulation::save() const {
    std::ostringstream front;
    front_.save(front);
    StateWriter archive;
    archive(front.str());
    visit(archive, *this);
    archive(outcomes_.size());
    for (const StepOutcome& step : outcomes_)
        visit_outcome(archive, step);
    archive(isolated_.size());
    for (const IsolatedEvent& event : isolated_)
        visit_event(archive, event);
    archive(present_valid_);
    archive(present_valid_ ? before_solve_.neutral : present_.neutral);
    archive(present_valid_ ? before_solve_.refresh : refresh_);
    archive(present_valid_ ? before_solve_.health : health_);
    return archive.text();
}

Simulation::Simulation(const Case& the_case, const std::string& saved) : Simulation(the_case) {
    StateReader archive(saved);
    std::string text;
    archive(text);
    std::istringstream front(text);
    front_ = geometry::Front::load(front);
    surface_ = geometry::extract_surface(front_);
    visit(archive, *this);
    std::size_t count = 0;
    archive(count);
    for (; count > 0; --count)
        visit_outcome(archive, outcomes_.emplace_back());
    archive(count);
    for (; count > 0; --count)
        visit_event(archive, isolated_.emplace_back());
    bool solved = false;
    archive(solved);
    archive(present_.neutral);
    archive(refresh_);
    archive(health_);
    if (!archive.at_end()) throw NumericsError("a saved state does not end where it should");
    for (const auto& error : displacement_errors_)
        RILLE_CHECK(error.size() == surface_.size(), "saved fields of another front");
    if (solved) arrivals();
}

} // namespace rille::engine
