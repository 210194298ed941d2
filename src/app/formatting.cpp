// What libfmt compiles, compiled into the program (docs/decisions/few-libraries.md): Debian has the library
// only to be loaded at the start.

#include <fmt/format-inl.h>

FMT_BEGIN_NAMESPACE
namespace detail {
template std::locale locale_ref::get<std::locale>() const;
template thousands_sep_result<char> thousands_sep_impl(locale_ref);
template char decimal_point_impl(locale_ref);
}  // namespace detail
FMT_END_NAMESPACE
