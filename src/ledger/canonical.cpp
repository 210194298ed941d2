#include <fmt/format.h>
#include <openssl/evp.h>

#include <array>
#include <fstream>
#include <memory>
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

using Digest = std::unique_ptr<EVP_MD_CTX, decltype(&EVP_MD_CTX_free)>;

void require(int success) {
    if (success != 1) throw std::runtime_error("SHA-256 is not available");
}

Digest new_digest() {
    Digest digest(EVP_MD_CTX_new(), EVP_MD_CTX_free);
    require(digest && EVP_DigestInit_ex(digest.get(), EVP_sha256(), nullptr) == 1 ? 1 : 0);
    return digest;
}

std::string hex_of(const Digest& digest) {
    std::array<unsigned char, EVP_MAX_MD_SIZE> bytes{};
    unsigned int length = 0;
    require(EVP_DigestFinal_ex(digest.get(), bytes.data(), &length));
    std::string text;
    for (unsigned int i = 0; i < length; ++i) text += fmt::format("{:02x}", bytes[i]);
    return text;
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
    const Digest digest = new_digest();
    require(EVP_DigestUpdate(digest.get(), bytes.data(), bytes.size()));
    return hex_of(digest);
}

std::string sha256_of_file(const std::string& path) {
    std::ifstream file(path, std::ios::binary);
    if (!file) return "";
    const Digest digest = new_digest();
    std::string piece(1 << 20, '\0');
    while (file.read(piece.data(), static_cast<std::streamsize>(piece.size())) || file.gcount() > 0)
        require(EVP_DigestUpdate(digest.get(), piece.data(), static_cast<std::size_t>(file.gcount())));
    return file.bad() ? "" : hex_of(digest);
}

}  // namespace ringwright
