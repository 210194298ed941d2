#include "ringwright/finding.hpp"

namespace ringwright {

std::string_view to_text(Severity severity) {
    switch (severity) {
        case Severity::note:
            return "note";
        case Severity::caution:
            return "caution";
        case Severity::defect:
            return "defect";
    }
    return "note";
}

}  // namespace ringwright
