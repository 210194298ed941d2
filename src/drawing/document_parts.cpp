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
