// The look of a page: one style sheet inside it, for screen and A4 paper, readable in grey.
#pragma once

#include <string_view>

namespace coilassay {

inline constexpr std::string_view kPageStyle = R"css(
html { font: 16px/1.5 system-ui, "DejaVu Sans", sans-serif; color: #1b1f24; background: #ffffff; }
body { max-width: 56rem; margin: 0 auto; padding: 1.5rem 1rem 3rem; }
header { border-bottom: 2px solid #14375e; margin-bottom: 1.25rem; }
h1 { font-size: 1.5rem; line-height: 1.25; margin: 0 0 .25rem; color: #14375e; overflow-wrap: anywhere; }
h2 { font-size: 1.1rem; margin: 1.75rem 0 .5rem; color: #14375e; }
h3 { font-size: 1rem; margin: 1.1rem 0 .35rem; font-weight: 600; }
header p { margin: 0 0 .75rem; color: #4a535c; }
table { border-collapse: collapse; width: 100%; font-variant-numeric: tabular-nums; }
th, td { text-align: left; padding: .3rem .8rem .3rem 0; vertical-align: top; border-bottom: 1px solid #d9dee3; overflow-wrap: anywhere; }
thead th { border-bottom: 1.5px solid #4a535c; font-size: .85rem; color: #3a424a; overflow-wrap: normal; }
tbody th { font-weight: 400; }
.values td.number { font-weight: 700; white-space: nowrap; }
.budget, .points, .equipment, .sources { font-size: .9rem; }
.sources td:nth-child(2) { font-family: "DejaVu Sans Mono", monospace; font-size: .75rem; word-break: break-all; }
.sources td:nth-child(2), .sources th:nth-child(2) { width: 56%; }
.small { font-size: .85rem; color: #4a535c; }
.verdict { border: 2px solid #1b1f24; padding: .6rem .9rem; }
.remarks { list-style: none; padding: 0; }
.remarks li { padding: .35rem .8rem; margin: .35rem 0; border-left: 4px solid #b3bfcc; }
.remarks li.caution { border-left: 4px dashed #a8480f; }
.remarks li.refusal { border-left: 8px double #8c1c13; }
.remarks strong { text-transform: uppercase; font-size: .8rem; letter-spacing: .04em; }
var { font-style: italic; }
sub { font-size: .75em; line-height: 0; }
figure { margin: .5rem 0; }
figure svg { display: block; width: 100%; height: auto; }
dl { display: grid; grid-template-columns: max-content 1fr; gap: .25rem 1.25rem; }
dt { color: #4a535c; }
dd { margin: 0; overflow-wrap: anywhere; }
footer { margin-top: 2rem; border-top: 1px solid #d9dee3; color: #4a535c; font-size: .85rem; }
@page { size: A4; margin: 16mm 15mm; }
@media print {
  html { font-size: 10pt; }
  body { max-width: none; padding: 0; }
  h2, h3 { break-after: avoid; }
  figure svg { width: auto; margin: 0 auto; }
  figure.short svg { max-height: 100mm; }
  figure.tall svg { max-height: 175mm; }
  figure, tr, .remarks li, .verdict { break-inside: avoid; }
  thead { display: table-header-group; }
}
)css";

}  // namespace coilassay
