// The report of a lot: one self-contained page, decision first, that prints well on A4 and reads in grey.
#pragma once

#include <string>
#include <string_view>

#include "report/figure.h"
#include "report/html_builder.h"
#include "report/lot_record.h"

namespace coilassay {

/// The whole page. Figures are drawn by gnuplot; without it the page says how to install it and keeps the numbers.
std::string lot_report(const LotRecord& lot);

/// A section for every unit that does not pass: its values against the limits, why, findings and figures.
void write_units_in_detail(HtmlBuilder& page, const LotRecord& lot);

/// How the lot was measured: tests, budgets with what is common to all units, equipment, room, sheets.
void write_measuring(HtmlBuilder& page, const LotRecord& lot);

/// All units in a table, and all files with their digests.
void write_all_units(HtmlBuilder& page, const LotRecord& lot);
void write_all_files(HtmlBuilder& page, const LotRecord& lot);

/// A figure, or the sentence that says how to have one. `prefix` makes its ids unique on the page; `css_class` says how
/// large it is printed.
void write_figure(HtmlBuilder& page, const Figure& figure, const std::string& prefix, std::string_view css_class);

}  // namespace coilassay
