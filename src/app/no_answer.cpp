#include "app/no_answer.hpp"

#include <fmt/format.h>

#include "app/messages.hpp"

namespace ringwright::app {

Problem why_no_answer(const Identification& identification) {
    Problem problem{"", "", "no method can answer",
                    "See ringwright inspect, or give the window with --from and --to"};
    if (identification.recordings.empty()) return problem;
    const RecordingIdentification& first = identification.recordings.front();
    problem.file = first.recording.origin.file == "-" ? "standard input" : first.recording.origin.file;
    if (first.events.empty()) {
        problem.found = "no release found: " + without_period(first.reason);
        return problem;
    }
    const EventIdentification& event = first.events.front();
    problem.place = fmt::format("release at {:.4g} s", event.start_s);
    problem.found = "no method can answer: " + without_period(event.curve_fit.reason);
    return problem;
}

Problem why_no_answer_after(const Identification& identification, Format format, const std::string& output) {
    Problem problem = why_no_answer(identification);
    const bool shown = format == Format::text && (output.empty() || output == "-") && errors_follow_answer();
    if (shown) problem.found = "no method can answer, for the reason above";
    return problem;
}

}  // namespace ringwright::app
