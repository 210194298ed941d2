// The report as one HTML page: its style in it, its figures as SVG in it, no script.

#include <fmt/format.h>

#include <string>

#include "drawing/document.hpp"
#include "drawing/palette.hpp"
#include "drawing/surface.hpp"
#include "drawing/svg_tidy.hpp"

namespace ringwright::drawing {
namespace {

constexpr const char* style = R"css(
:root{color-scheme:light dark;--ink:#1f2328;--muted:#59636e;--rule:#d5dae0;--paper:#fff;--page:#f4f5f7;--tile:#f6f8fa;
--good:#1a6b3c;--bad:#a01c28;--open:#8a5a00}
@media (prefers-color-scheme:dark){:root{--ink:#e6edf3;--muted:#a3adb8;--rule:#333b45;--paper:#11151a;--page:#0b0e12;
--tile:#1a2028;--good:#5cc98a;--bad:#ff7b84;--open:#e5b454}
:root .fig{DARK}}
*{box-sizing:border-box}
body{margin:0;background:var(--page);color:var(--ink);font:15px/1.5 "Helvetica Neue",Helvetica,Arial,"Liberation Sans",sans-serif;
overflow-wrap:anywhere;-webkit-text-size-adjust:100%}
main{max-width:56rem;margin:2rem auto;padding:2.2rem 2.6rem;background:var(--paper);border:1px solid var(--rule);border-radius:8px}
h1{font-size:1.7rem;line-height:1.2;margin:0 0 .2rem;font-weight:650;letter-spacing:-.01em}
h2{font-size:1.2rem;margin:2.2rem 0 .6rem;padding-top:.8rem;border-top:1px solid var(--rule);font-weight:650}
h3{font-size:1rem;margin:1.6rem 0 .4rem;font-weight:650}
p{margin:.5rem 0;max-width:46rem}.fine{font-size:.87rem;color:var(--muted)}
.over{color:var(--muted);font-size:.87rem;margin:0 0 .3rem}
dl{display:grid;grid-template-columns:minmax(7rem,auto) 1fr;gap:.15rem 1.2rem;margin:.6rem 0}
dl.brief{grid-template-columns:auto 1fr auto 1fr}
dt{color:var(--muted)}dd{margin:0;min-width:0;text-align:left}
.answer{margin:1.2rem 0}.verdict{font-size:1.5rem;font-weight:700;line-height:1.25;margin:0;padding-left:.8rem;border-left:.4rem solid}
.conforms{color:var(--good)}.does_not_conform{color:var(--bad)}.undecided{color:var(--open)}
.answer>p{margin:.2rem 0 .8rem}
.tiles{display:grid;grid-template-columns:repeat(auto-fit,minmax(10.5rem,1fr));gap:.7rem;margin:.9rem 0}
.tile{background:var(--tile);border:1px solid var(--rule);border-radius:6px;padding:.7rem .9rem}
.tile b{display:block;font-size:1.32rem;font-weight:650;line-height:1.25;font-variant-numeric:tabular-nums}
.tile span{display:block;color:var(--muted);font-size:.87rem;font-variant-numeric:tabular-nums}
.scroll{overflow-x:auto;margin:.6rem 0}table{border-collapse:collapse;width:100%;font-size:.92rem;overflow-wrap:break-word}
th,td{text-align:left;vertical-align:top;padding:.34rem .7rem .34rem 0;border-bottom:1px solid var(--rule)}
th{color:var(--muted);font-weight:600;vertical-align:bottom}
.num{text-align:right;font-variant-numeric:tabular-nums}td.num{white-space:nowrap}th:last-child,td:last-child{padding-right:0}
.pair{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(18rem,100%),1fr));gap:1.4rem}
figure{margin:1rem 0;min-width:0}figure svg{display:block;width:100%;height:auto}
figcaption{font-size:.87rem;color:var(--muted);margin-top:.3rem}figcaption b{color:var(--ink);font-weight:600}
ul.notes{list-style:none;margin:.6rem 0;padding:0}ul.notes li{padding:.4rem 0 .4rem .8rem;border-left:3px solid var(--rule);margin:.35rem 0}
ul.notes li.caution{border-color:var(--open)}ul.notes li.defect{border-color:var(--bad)}
ul.notes b{font-weight:600;text-transform:capitalize}
.sign{display:grid;grid-template-columns:1fr 1fr 1fr;gap:2rem;margin:3.4rem 0 1rem}.sign div{border-top:1px solid var(--ink);padding-top:.25rem;font-size:.87rem;color:var(--muted)}
@media (max-width:640px){main{margin:0;border:0;border-radius:0;padding:1.2rem 1rem}dl.brief{grid-template-columns:minmax(7rem,auto) 1fr}
.sign{grid-template-columns:1fr;gap:2.6rem}h1{font-size:1.4rem}.tiles{grid-template-columns:1fr 1fr;gap:.5rem}.tile{padding:.55rem .65rem}.tile b{font-size:1.1rem}.wide{overflow-x:auto}.wide svg{min-width:30rem}}
@page{margin:16mm 18mm}
@media print{:root{color-scheme:light;--ink:#1f2328;--muted:#59636e;--rule:#d5dae0;--paper:#fff;--page:#fff;--tile:#fff;--good:#1a6b3c;--bad:#a01c28;--open:#8a5a00}
:root .fig{LIGHT}
body{font-size:10pt;background:none}main{max-width:none;margin:0;padding:0;border:0}h2,h3{break-after:avoid}figure,.answer,tr,li,.sign{break-inside:avoid}.sign,.together~p{break-before:avoid}
.newpage{break-before:page}.scroll,.wide{overflow:visible}dl.brief{grid-template-columns:auto 1fr auto 1fr}
.tiles{grid-template-columns:repeat(4,1fr)}.pair{grid-template-columns:1fr 1fr}.wide svg{min-width:0}}
)css";

std::string figure_colours(bool dark) {
    std::string text;
    for (const ThemedColour& colour : themed_colours) {
        const std::string light =
            fmt::format("#{:02x}{:02x}{:02x}", colour.light.red, colour.light.green, colour.light.blue);
        text += fmt::format("{}:{};", colour.property, dark ? std::string(colour.dark) : light);
    }
    return text;
}

std::string filled_style() {
    std::string text = style;
    text.replace(text.find("DARK"), 4, figure_colours(true));
    text.replace(text.find("LIGHT"), 5, figure_colours(false));
    return text;
}

/// One writer for each kind of block.
class HtmlWriter {
  public:
    std::string body;

    void operator()(const Heading& heading) {
        body += fmt::format("<h{0}{2}>{1}</h{0}>\n", heading.level, escaped(heading.text),
                            heading.together ? " class=\"together\"" : take_break());
    }
    void operator()(const Paragraph& paragraph) {
        body += fmt::format("<p{} dir=\"auto\">{}</p>\n", paragraph.fine ? " class=\"fine\"" : "",
                            escaped(paragraph.text));
    }
    void operator()(const Answer& answer) {
        body += "<div class=\"answer\">\n";
        if (!answer.headline.empty())
            body += fmt::format("<p class=\"verdict {}\">{}</p>\n", escaped(answer.verdict),
                                escaped(answer.headline));
        if (!answer.reading.empty()) body += fmt::format("<p>{}</p>\n", escaped(answer.reading));
        if (!answer.tiles.empty()) body += "<div class=\"tiles\">\n";
        for (const Tile& tile : answer.tiles)
            body += fmt::format("<div class=\"tile\"><span>{}</span><b>{}</b><span>{}</span></div>\n",
                                escaped(tile.name), escaped(tile.value), escaped(tile.note));
        body += answer.tiles.empty() ? "</div>\n" : "</div>\n</div>\n";
    }
    void operator()(const Facts& facts) {
        body += facts.brief ? "<dl class=\"brief\">\n" : "<dl>\n";
        for (const auto& [name, value] : facts.rows)
            body += fmt::format("<dt>{}</dt><dd dir=\"auto\">{}</dd>\n", escaped(name), escaped(value));
        body += "</dl>\n";
    }
    void operator()(const Table& table) {
        body += "<div class=\"scroll\"><table><thead>" + row(table.header, table.numeric, "th") +
                "</thead>\n<tbody>\n";
        for (const auto& cells : table.rows) body += row(cells, table.numeric, "td") + "\n";
        body += "</tbody></table></div>\n";
    }
    void operator()(const Pictures& pictures) {
        const bool beside = set_beside(pictures);
        if (beside) body += "<div class=\"pair\">\n";
        for (const NamedFigure& figure : pictures.figures) picture(figure, beside);
        if (beside) body += "</div>\n";
    }
    void operator()(const Notes& notes) {
        body += "<ul class=\"notes\">\n";
        for (const Note& note : notes.notes)
            body += fmt::format("<li class=\"{0}\" dir=\"auto\"><b>{0}</b> · {1}</li>\n",
                                escaped(note.severity), escaped(note.text));
        body += "</ul>\n";
    }
    void operator()(const SignatureLines&) {
        body += "<div class=\"sign\"><div>Remarks</div><div>Date</div><div>Name and signature</div></div>\n";
    }
    void operator()(const PageBreak&) { pending_break_ = true; }

  private:
    std::string take_break() {
        const bool now = pending_break_;
        pending_break_ = false;
        return now ? " class=\"newpage\"" : "";
    }
    static std::string row(const std::vector<std::string>& cells, const std::vector<bool>& numeric,
                           const char* tag) {
        std::string text = "<tr>";
        for (std::size_t i = 0; i < cells.size(); ++i)
            text += fmt::format("<{0}{1} dir=\"auto\">{2}</{0}>", tag,
                                i < numeric.size() && numeric[i] ? " class=\"num\"" : "", escaped(cells[i]));
        return text + "</tr>";
    }
    void picture(const NamedFigure& figure, bool beside) {
        const FigureSize size = page_figure_size(figure, beside, 482.0);
        const std::string prefix = fmt::format("f{}-", ++figure_count_);
        body += fmt::format("<figure class=\"fig{}\">{}<figcaption><b>{}.</b> {}</figcaption></figure>\n",
                            beside ? "" : " wide",
                            inline_svg(figure_svg(figure.figure, size, false), prefix, figure.title),
                            escaped(figure.title), escaped(figure.caption));
    }

    std::size_t figure_count_ = 0;
    bool pending_break_ = false;
};

}  // namespace

std::string to_html(const Document& document) {
    HtmlWriter writer;
    for (const Block& block : document.blocks) std::visit(writer, block);
    const std::string name =
        document.subject.empty() ? document.title : document.title + ": " + document.subject;
    return fmt::format(
        "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n"
        "<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n"
        "<meta name=\"generator\" "
        "content=\"{}\">\n<title>{}</title>\n<style>{}</style>\n</head>\n<body>\n<main>\n"
        "<p class=\"over\">{} {}</p>\n<h1>{}</h1>\n{}</main>\n</body>\n</html>\n",
        escaped(document.creator), escaped(name), filled_style(), escaped(document.kind),
        escaped(document.number), escaped(document.title), writer.body);
}

}  // namespace ringwright::drawing
