"""Pieces of a self-contained HTML page: escaped text, tables, figures as inline SVG, the style sheet.

Whatever comes from a file goes through text(); nothing else may put it into the page.
"""

import html
import math
import re
import xml.etree.ElementTree as ET

from skymend_files import clean

SVG, XLINK = "http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"
ET.register_namespace("", SVG)
ET.register_namespace("xlink", XLINK)

STYLE = """
:root { color-scheme: light; }
body { font: 16px/1.5 Georgia, "Times New Roman", serif; color: #111; background: #fff; max-width: 60rem;
  margin: 2rem auto; padding: 0 1.2rem; }
h1, h2, h3, th, caption, figcaption, nav, .meta { font-family: "DejaVu Sans", Verdana, Arial, sans-serif; }
h1 { font-size: 1.6rem; line-height: 1.25; margin-bottom: .3rem; }
h2 { font-size: 1.2rem; margin-top: 2.4rem; border-bottom: 2px solid #0072B2; padding-bottom: .15rem; }
h3 { font-size: 1rem; margin-top: 1.6rem; }
.meta, figcaption, caption { font-size: .82rem; color: #333; }
.box { border-left: 5px solid #0072B2; background: #f2f7fb; padding: .6rem 1rem; margin: 1rem 0; }
.caution { border-left-color: #D55E00; background: #fdf4ee; }
table { border-collapse: collapse; width: 100%; margin: 1rem 0; font-size: .86rem; line-height: 1.35;
  font-variant-numeric: tabular-nums; }
caption { text-align: left; padding-bottom: .3rem; caption-side: top; }
th, td { padding: .22rem .5rem; text-align: left; vertical-align: top; border-bottom: 1px solid #ccc; }
thead th { border-bottom: 2px solid #444; vertical-align: bottom; font-size: .78rem; }
tbody th { font-weight: normal; }
td.n, th.n { text-align: right; }
tfoot td, tfoot th { border-top: 2px solid #444; }
.error { white-space: nowrap; color: #444; }
.small { font-size: .76rem; }
.small th, .small td { padding: .08rem .4rem; }
.series tbody th { min-width: 10em; }
.keep { white-space: nowrap; }
.wide { overflow-x: auto; }
figure { margin: 1.4rem 0; }
figure svg { width: 100%; height: auto; display: block; max-height: 90vh; }
svg * { stroke-linejoin: round; stroke-linecap: butt; }
pre { font-size: .75rem; line-height: 1.3; white-space: pre-wrap; overflow-wrap: anywhere; background: #f6f6f6;
  padding: .6rem; }
.sources { font-size: .82rem; padding-left: 1.2rem; }
td, th, li { overflow-wrap: anywhere; }
thead th, td.n { overflow-wrap: normal; }
@page { size: A4; margin: 16mm 15mm; }
@media print {
  body { font-size: 10pt; max-width: none; margin: 0; padding: 0; }
  nav { display: none; }
  h2, h3 { break-after: avoid; }
  figure, .box, tr, table.whole { break-inside: avoid; }
  figure svg { max-height: 235mm; }
  .sources, pre { columns: 2; column-gap: 8mm; }
  .sources { font-size: 7pt; line-height: 1.3; }
  thead { display: table-header-group; }
  .box, thead { print-color-adjust: exact; -webkit-print-color-adjust: exact; }
  .wide { overflow: visible; }
  table { font-size: 7.5pt; } th, td { padding: .1rem .25rem; } .small th, .small td { padding: .02rem .25rem; }
   .small { font-size: 7pt; } pre { font-size: 7pt; }
}
"""


def text(value):
    """Text of a file, fit for an element or a quoted attribute."""
    return html.escape(clean(value), quote=True)


def number(value, error=None, most=4):
    """A number with its numerical error, digits by the error (two significant ones), else as plain() has it. The
    element data carries all digits. A missing value is a dash."""
    if value is None or not math.isfinite(value):
        return "–"
    if error is not None and math.isfinite(error) and error > 0.0:
        digits = min(max(1 - math.floor(math.log10(error)), 0), most)
        shown, after = f"{value:.{digits}f}", f' <span class="error">± {error:.{digits}f}</span>'
    else:
        shown, after = plain(value), ""
    return f'<data value="{value!r}">{minus(shown)}</data>{after}'


def plain(value):
    """Four significant digits and, up to 1e4, one behind the point; no exponent for what a table is likely to hold."""
    if value != 0.0 and not 1e-3 <= abs(value) < 1e9:
        return f"{value:.3e}"
    size = 0 if value == 0.0 else math.floor(math.log10(abs(value)))
    digits = max(3 - size, 1 if size < 4 else 0)
    shown = f"{value:.{digits}f}"
    return shown.rstrip("0").rstrip(".") if "." in shown else shown


def minus(shown):
    """The sign of minus that is one."""
    return shown.replace("-", "−")


def table(caption, head, rows, numbers=(), foot=(), kind=""):
    """A table. head: texts; rows and foot: lists of cells that are HTML already, the first the row's header; numbers:
    columns set to the right."""
    def cells(row):
        made = []
        for i, cell in enumerate(row):
            side = ' class="n"' if i in numbers else ""
            made.append(f'<th scope="row"{side}>{cell}</th>' if i == 0 else f"<td{side}>{cell}</td>")
        return "<tr>" + "".join(made) + "</tr>"

    side = [' class="n"' if i in numbers else "" for i in range(len(head))]
    top = "".join(f'<th scope="col"{side[i]}>{text(cell)}</th>' for i, cell in enumerate(head))
    end = f"<tfoot>{''.join(cells(row) for row in foot)}</tfoot>" if foot else ""
    kind += " whole" if len(rows) <= 30 else ""
    return (f'<div class="wide"><table class="{kind.strip()}"><caption>{text(caption)}</caption>'
            f"<thead><tr>{top}</tr></thead><tbody>{''.join(cells(row) for row in rows)}</tbody>{end}</table></div>\n")


def inline_svg(content, prefix, label):
    """An SVG picture as an element of the page: without prolog, metadata and style of its own, every id with a prefix
    so that pictures do not take each other's clips and marks, and named for those who hear the page."""
    root = ET.fromstring(content)
    for parent in list(root.iter()):
        for child in list(parent):
            if child.tag in (f"{{{SVG}}}metadata", f"{{{SVG}}}style", f"{{{SVG}}}title"):
                parent.remove(child)
    for element in root.iter():
        for key, value in list(element.attrib.items()):
            if key == "id":
                element.set(key, prefix + value)
            elif key == f"{{{XLINK}}}href" and value.startswith("#"):
                element.set(key, "#" + prefix + value[1:])
            elif "url(#" in value:
                element.set(key, re.sub(r"url\(#", f"url(#{prefix}", value))
    for key in ("width", "height", "version"):
        root.attrib.pop(key, None)
    root.set("role", "img")
    root.set("aria-label", clean(label))
    return ET.tostring(root, encoding="unicode")


def figure(content, prefix, label, caption):
    """A numbered figure; label says what is to be seen, caption is HTML."""
    return f"<figure>{inline_svg(content, prefix, label)}<figcaption>{caption}</figcaption></figure>\n"


def page(title, body):
    """The whole page. It loads nothing: the policy in its head forbids it."""
    return f"""<!DOCTYPE html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; img-src data:; style-src 'unsafe-inline'">
<title>{text(title)}</title>
<style>{STYLE}</style>
</head>
<body>
{body}</body>
</html>
"""
