#pragma once
// A report as a list of blocks, before it takes a form: what is said, in which order, and nothing of how it
// looks.

#include <nlohmann/json_fwd.hpp>
#include <string>
#include <utility>
#include <variant>
#include <vector>

#include "ringwright/figures.hpp"
#include "ringwright/report_document.hpp"

namespace ringwright::drawing {

struct Heading {
    int level = 2;  ///< 2: part, 3: section
    std::string text;
    bool together = false;  ///< stands on one page with all that follows
};
struct Paragraph {
    std::string text;
    bool fine = false;  ///< small print
};

/// The answer at a glance.
struct Tile {
    std::string name, value, note;
};
struct Answer {
    std::string verdict;  ///< "conforms", "does_not_conform", "undecided" or empty
    std::string headline, reading;
    std::vector<Tile> tiles;
};

/// Names and values, one a line.
struct Facts {
    std::vector<std::pair<std::string, std::string>> rows;
    bool brief = false;  ///< two columns where there is room
};
struct Table {
    std::vector<std::string> header;
    std::vector<std::vector<std::string>> rows;
    std::vector<bool> numeric;  ///< by column: set right
};
/// One figure over the whole width, or two beside each other.
struct Pictures {
    std::vector<NamedFigure> figures;
};
struct Note {
    std::string severity, text;
};
struct Notes {
    std::vector<Note> notes;
};
/// Lines for a signature and remarks by hand.
struct SignatureLines {};
/// What follows begins on a new page.
struct PageBreak {};

using Block =
    std::variant<Heading, Paragraph, Answer, Facts, Table, Pictures, Notes, SignatureLines, PageBreak>;

struct Document {
    std::string title, number, subject, date, creator;  ///< date: "2031-04-02" or empty
    std::string kind = "Test report";                   ///< stands before the number
    std::vector<Block> blocks;
};

/// What the report of an identification says.
[[nodiscard]] Document identification_document(const nlohmann::ordered_json& result,
                                               const ReportInput& input);
/// What the report of a comparison, a chart over the ledger or a gauge study says.
[[nodiscard]] Document comparison_document(const nlohmann::ordered_json& result);
[[nodiscard]] Document chart_document(const nlohmann::ordered_json& result);
[[nodiscard]] Document gauge_document(const nlohmann::ordered_json& result);
/// The document that the schema of the result asks for.
[[nodiscard]] Document document_of(const nlohmann::ordered_json& result, const ReportInput& input);
/// Parses the result; throws InputError when it is none that can be drawn.
[[nodiscard]] nlohmann::ordered_json parsed_result(const std::string& text, const std::string& file);

[[nodiscard]] std::string to_html(const Document& document);
[[nodiscard]] std::string to_pdf(const Document& document, PaperSize paper);

/// True when the figures stand side by side, or one stands small as if it had a neighbour.
[[nodiscard]] bool set_beside(const Pictures& pictures);
/// Width and font of a figure within a page: alone, or one of two beside each other.
[[nodiscard]] FigureSize page_figure_size(const NamedFigure& figure, bool beside, double whole_width);

}  // namespace ringwright::drawing
