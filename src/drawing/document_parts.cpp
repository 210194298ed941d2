#include "drawing/document_parts.hpp"

#include <fmt/format.h>
#include <openssl/sha.h>

#include <algorithm>
#include <array>
#include <iterator>

#include "drawing/fonts.hpp"
#include "ringwright/error.hpp"

namespace ringwright::drawing {
namespace {

constexpr const char* drawn_schemas[] = {schemas::identification, schemas::comparison, schemas::chart,
                                         schemas::gauge};

}  // namespace

void add_fact(FactRows& rows, const char* name, const std::string& value) {
    if (!value.empty()) rows.emplace_back(name, value);
}

FactRows sheet_facts(const Json& result) {
    FactRows rows;
    const Json& sheet = at(result, {"test_sheet"});
    add_fact(rows, "Article", text_at(sheet, {"article_type"}));
    add_fact(rows, "Serial number", text_at(sheet, {"serial"}));
    add_fact(rows, "Date of test", text_at(sheet, {"date"}));
    add_fact(rows, "Tested by", text_at(sheet, {"operator"}));
    return rows;
}

void add_sensor(FactRows& rows, const Json& result) {
    const Json& sheet = at(result, {"test_sheet"});
    add_fact(rows, "Sensor", text_at(sheet, {"sensor"}));
    add_fact(rows, "Sensor calibrated", text_at(sheet, {"sensor_calibrated"}));
    add_fact(rows, "Calibration due", text_at(sheet, {"sensor_due"}));
}

void add_provenance(FactRows& rows, const Json& result, const std::string& command) {
    add_fact(rows, "Test sheet", text_at(result, {"test_sheet", "file"}));
    add_fact(rows, "SHA-256 of the sheet", text_at(result, {"test_sheet", "sha256"}));
    const std::string software = text_at(result, {"software", "name"});
    if (!software.empty())
        add_fact(rows, "Software", software + " " + text_at(result, {"software", "version"}));
    add_fact(rows, "Command", command);
}

Document opened(const Json& result, const char* kind, const std::string& title) {
    Document document;
    document.kind = kind;
    document.title = title;
    document.number = report_number(result);
    document.subject = article_name(result);
    document.date = text_at(result, {"test_sheet", "date"});
    document.creator = text_at(result, {"software", "name"}) + " " + text_at(result, {"software", "version"});
    return document;
}

Note note_of(const Json& finding) {
    return {text_at(finding, {"severity"}), text_at(finding, {"message"})};
}

void add_notes(std::vector<Block>& blocks, const Notes& notes) {
    if (notes.notes.empty()) return;
    blocks.push_back(Heading{2, "Findings"});
    blocks.push_back(notes);
}

void add_signature(std::vector<Block>& blocks, const std::vector<std::string>& remarks) {
    blocks.push_back(Heading{2, "Remarks and signature", true});
    for (const std::string& remark : remarks) blocks.push_back(Paragraph{remark, false});
    blocks.push_back(SignatureLines{});
}

std::string with_unit(double value, const std::string& unit, int digits) {
    return fmt::format("{:.{}g}", value, digits) + (unit == "1" || unit.empty() ? "" : " " + unit);
}

std::string p_text(std::optional<double> p) {
    if (!p) return "—";
    return *p < 1e-4 ? "< 0.0001" : fmt::format("{:.4f}", *p);
}

std::string range_text(std::optional<double> low, std::optional<double> high) {
    if (low && high) return fmt::format("{:.6g} … {:.6g}", *low, *high);
    if (low) return fmt::format("≥ {:.6g}", *low);
    return high ? fmt::format("≤ {:.6g}", *high) : "";
}

std::string report_number(const Json& result) {
    const std::string result_json = result.dump(-1, ' ', false, Json::error_handler_t::replace);
    std::array<unsigned char, SHA256_DIGEST_LENGTH> hash{};
    SHA256(reinterpret_cast<const unsigned char*>(result_json.data()), result_json.size(), hash.data());
    return fmt::format("{:02X}{:02X}-{:02X}{:02X}-{:02X}{:02X}", hash[0], hash[1], hash[2], hash[3], hash[4],
                       hash[5]);
}

std::string confidence_text(const Json& result) {
    return fmt::format("{:.4g} %", 100.0 * number_at(result, {"confidence_level"}).value_or(0.95));
}

std::string article_name(const Json& result) {
    const std::string type = text_at(result, {"test_sheet", "article_type"});
    const std::string serial = text_at(result, {"test_sheet", "serial"});
    if (type.empty()) return serial.empty() ? "" : "serial " + serial;
    return serial.empty() ? type : type + ", serial " + serial;
}

std::string cell(const std::string& text) {
    return text.empty() ? "—" : text;
}

const NamedFigure* find_figure(const std::vector<NamedFigure>& figures, const std::string& name) {
    const auto found = std::ranges::find(figures, name, &NamedFigure::name);
    return found == figures.end() ? nullptr : &*found;
}

void add_picture(std::vector<Block>& blocks, const std::vector<NamedFigure>& figures,
                 const std::string& name) {
    if (const NamedFigure* figure = find_figure(figures, name)) blocks.push_back(Pictures{{*figure}});
}

std::string quoted(const std::string& word) {
    constexpr const char* plain = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_./=:,+%";
    if (!word.empty() && word.find_first_not_of(plain) == std::string::npos) return word;
    std::string text(1, '\'');
    for (const char letter : word)
        if (letter == '\'')
            text.append("'\\''");
        else
            text.push_back(letter);
    text.push_back('\'');
    return text;
}

std::string file_words(const std::string& file, const std::string& added_mass) {
    std::string words(1, ' ');
    words.append(quoted(file));
    if (!added_mass.empty()) words.append(" --added-mass ").append(quoted(added_mass));
    return words;
}

std::string closing_words(const Json& result) {
    std::string words;
    const std::string sheet = text_at(result, {"test_sheet", "file"});
    if (!sheet.empty()) words.append(" --sheet ").append(quoted(sheet));
    for (const Json& option : list_at(result, {"options"}))
        if (option.is_string()) words.append(" ").append(quoted(option.get<std::string>()));
    return words;
}

Json parsed_result(const std::string& text, const std::string& file) {
    const Json result = Json::parse(text, nullptr, false);
    if (result.is_discarded())
        throw InputError({file, "", "is no JSON", "Give a result that a command wrote with --format json"});
    const std::string schema = text_at(result, {"schema"});
    if (std::ranges::find(drawn_schemas, schema) == std::end(drawn_schemas))
        throw InputError({file, "key schema", schema.empty() ? "is absent" : "is " + clean_utf8(schema),
                          "Give what identify, verify, compare, ledger chart or ledger gauge wrote as JSON"});
    return result;
}

}  // namespace ringwright::drawing
