#include <fmt/format.h>
#include <openssl/evp.h>

#include <array>
#include <stdexcept>

#include "ledger/documents.hpp"
#include "ringwright/ledger.hpp"

namespace ringwright {
namespace {

void append(std::string& text, std::string_view name, std::string_view bytes) {
    text += fmt::format("{} {}\n", name, bytes.size());
    text += bytes;
    text += '\n';
}

std::string number_or_nothing(std::optional<std::int64_t> number) {
    return number ? fmt::format("{}", *number) : std::string();
}

}  // namespace

std::string canonical_text(const LedgerEntry& entry) {
    std::string text = "ringwright ledger entry 1\n";
    const EntrySummary& summary = entry.summary;
    append(text, "number", fmt::format("{}", summary.number));
    append(text, "utc", summary.utc);
    append(text, "software_version", summary.software_version);
    append(text, "previous_hash", summary.previous_hash);
    append(text, "supersedes", number_or_nothing(summary.supersedes));
    append(text, "reason", summary.reason);
    append(text, "article_type", summary.article_type);
    append(text, "serial", summary.serial);
    append(text, "operator", summary.test_operator);
    append(text, "test_date", summary.test_date);
    append(text, "decision", summary.decision);
    append(text, "arguments", documents::arguments_as_json(entry.arguments));
    append(text, "recordings", documents::recordings_as_json(entry.recordings));
    append(text, "sheet_name", entry.sheet_name);
    append(text, "sheet", entry.sheet_text);
    append(text, "result", entry.result_json);
    return text;
}

std::string sha256_of(std::string_view bytes) {
    std::array<unsigned char, EVP_MAX_MD_SIZE> digest{};
    unsigned int length = 0;
    if (EVP_Digest(bytes.data(), bytes.size(), digest.data(), &length, EVP_sha256(), nullptr) != 1)
        throw std::runtime_error("SHA-256 is not available");
    std::string text;
    for (unsigned int i = 0; i < length; ++i) text += fmt::format("{:02x}", digest[i]);
    return text;
}

}  // namespace ringwright
