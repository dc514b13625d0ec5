"""How the pages look: colours for light and dark, type, the narrow page, the printed page.

Colours that letters are set in are called ``text…`` or ``mode-…``, grounds ``paper`` and ``panel``:
a test works out that each of them can be read on both grounds.
"""

from __future__ import annotations

COLOURS = {
    # name: (light, dark)
    "paper": ("#fcfbf8", "#17191b"),
    "panel": ("#f3f0e9", "#212427"),
    "text": ("#23211d", "#e9e5dc"),
    "text-quiet": ("#5d584e", "#aea89b"),
    "text-off": ("#9c2a1a", "#ff9a84"),
    "text-mend": ("#1f5f43", "#84d3a8"),
    "text-seam": ("#5a3a8a", "#c7acf2"),
    "text-link": ("#1d5673", "#8cc8e6"),
    "mode-1": ("#1d5673", "#8cc8e6"),
    "mode-2": ("#8a4a0b", "#e9b06c"),
    "mode-3": ("#2f6430", "#95cf8e"),
    "mode-4": ("#84285c", "#eb9fca"),
    "mode-5": ("#55554f", "#bcbcb2"),
    "rung": ("#ddd8cc", "#34383c"),
    "rule": ("#c9c3b5", "#454a4f"),
    "line": ("#23211d", "#e9e5dc"),
}
"""Each colour, for a light and for a dark page."""


def _scheme(which: int) -> str:
    return ":root{" + "".join(f"--{name}:{pair[which]};" for name, pair in COLOURS.items()) + "}"


_MODES = "".join(
    f".mode-{n}{{stroke:var(--mode-{n})}}text.mode-{n}{{stroke:none;fill:var(--mode-{n})}}"
    for n in range(1, 6)
)

_TYPE = """
*{box-sizing:border-box}
html{color-scheme:light dark;scroll-padding:1rem 0 9rem;-webkit-text-size-adjust:100%;text-size-adjust:100%}
body{margin:0;background:var(--paper);color:var(--text);
  font:1rem/1.55 Charter,"Bitstream Charter","Iowan Old Style",Palatino,"Palatino Linotype",Georgia,serif}
main,header,footer{max-width:74rem;margin:0 auto;padding:0 2rem}
header{padding-top:2.2rem}
footer{padding-bottom:2.5rem;color:var(--text-quiet);font-size:.9rem}
h1{font-size:2rem;font-weight:400;line-height:1.2;margin:0;overflow-wrap:anywhere}
h2{font-size:1.2rem;font-weight:400;margin:2.6rem 0 .7rem;padding-top:.5rem;border-top:1px solid var(--rule)}
h3,h4{font-size:1rem;font-weight:600;margin:1.2rem 0 .3rem}
h4{font-weight:400}
p,ul,dl{margin:.4rem 0;max-width:46rem}
ul{padding-left:1.2rem}
li{margin:.2rem 0}
a{color:var(--text-link);text-underline-offset:.18em}
bdi{overflow-wrap:anywhere}
.quiet{color:var(--text-quiet)}
.verdict{font-size:1.5rem;line-height:1.3;margin:1.4rem 0 .5rem;max-width:none}
.stays,.leaves{font-size:1.1rem;padding:.5rem .8rem;border-left:.3rem solid var(--text-mend);
  background:var(--panel)}
.leaves{border-left-style:double;border-left-color:var(--text-off)}
.lost{border-left:.3rem double var(--text-off);padding-left:1rem;list-style:none}
.glance{list-style:none;padding:0}
.two{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(100%,28rem),1fr));gap:0 3rem}
dt{color:var(--text-quiet);font-size:.9rem;margin-top:.5rem}
dd{margin:0}
.step{list-style:none;padding:0}
.step li{padding-left:1.5rem;text-indent:-1.5rem}
.sign{display:inline-block;width:1.5rem;text-indent:0}
.heard .sign{color:var(--text-mend)}
.off{color:var(--text-off)}
.mend{color:var(--text-mend)}
.unbroken{white-space:nowrap}
summary{cursor:pointer}
summary h2,summary h3,summary h4{display:inline;margin:0;padding:0;border:0}
details{margin:.5rem 0}
main>details{margin:2.6rem 0 .7rem;padding-top:.5rem;border-top:1px solid var(--rule)}
:focus-visible{outline:2px solid var(--text-link);outline-offset:2px}
.aside{position:absolute;width:1px;height:1px;overflow:hidden;clip-path:inset(50%);white-space:nowrap}
"""

_TABLES = """
table{border-collapse:collapse;width:100%;margin:.6rem 0;font-size:.92rem;font-variant-numeric:tabular-nums}
caption{text-align:left;color:var(--text-quiet);padding-bottom:.3rem}
th,td{text-align:left;vertical-align:top;padding:.3rem .9rem .3rem 0;border-bottom:1px solid var(--rung);
  font-weight:400;overflow-wrap:break-word}
.short{width:auto}
.short th,.short td{padding-right:1.6rem}
thead th{color:var(--text-quiet);font-size:.85rem;border-bottom-color:var(--rule);overflow-wrap:normal}
.scrolled{overflow-x:auto}
.scrolled th,.scrolled td{overflow-wrap:normal}
.share{display:inline-block;width:8rem;height:.55rem;border:1px solid var(--rule);margin-right:.6rem}
.share i{display:block;height:100%;background:var(--mode-1)}
"""

_CHART = """
.staff{padding-left:var(--gutter);margin:1rem 0 0;line-height:0;font-family:system-ui,"Segoe UI",Roboto,
  "Helvetica Neue",Arial,sans-serif;position:relative;isolation:isolate}
.piece{position:relative;display:inline-block;margin:0 0 1.6rem calc(-1*var(--gutter));vertical-align:top;
  overflow:visible;break-inside:avoid;pointer-events:none}
.piece text{font-size:11px;fill:var(--text-quiet);line-height:1}
.ground{fill:var(--paper)}
.rung{stroke:var(--rung)}
.rung.final{stroke:var(--text-quiet);stroke-width:1.6}
.rung.dominant{stroke:var(--text-quiet);stroke-dasharray:8 4}
.rung.guest{stroke-dasharray:1 4;stroke:var(--rule)}
.perde.guest{font-style:italic}
.gutter .perde{text-anchor:end}
.piece .perde.final,.piece .perde.dominant{fill:var(--text)}
.does{font-style:italic}
.tick{stroke:var(--rule)}
line.bar{stroke:var(--rule)}
line.way{stroke:var(--text-mend);stroke-dasharray:1 2}
.piece .seam text,.piece text.seam{fill:var(--text-seam);font-weight:600}
.seam text{pointer-events:all;cursor:default}
.seam line{stroke:var(--text-seam);stroke-width:1.5;stroke-dasharray:5 3}
.join{fill:none;stroke:var(--line);stroke-width:.9}
.join.breathes{stroke-dasharray:1 3}
.breath{fill:none;stroke:var(--text);stroke-width:1.3}
.note{pointer-events:all;outline:none;cursor:default}
.hit{fill:var(--text);fill-opacity:0}
.note:hover .hit{fill-opacity:.07}
.note:focus .hit,.note.chosen .hit,.note:target .hit{fill-opacity:.1;stroke:var(--text-link);stroke-width:1.5}
.tone{stroke:var(--line);stroke-width:4;stroke-linecap:round}
.tone.rests{stroke-width:6.5}
.off .tone{stroke:var(--text-off);stroke-width:3}
.halo{stroke:var(--paper);stroke-width:5.5;fill:none}
.cross{stroke:var(--text-off);stroke-width:2;fill:none}
ellipse.mend{fill:var(--paper);stroke:var(--text-mend);stroke-width:1.8}
.piece .count{text-anchor:middle}
.piece .count.off{fill:var(--text-off);font-weight:600}
.grid{stroke:var(--rung)}
.ring{fill:none;stroke:var(--text-mend);stroke-width:1.8}
path.seam{stroke:var(--text-seam);stroke-width:1.5;stroke-dasharray:5 3}
.key line{stroke-width:2}
.chances polyline,.gutter line[class^=mode]{fill:none;stroke-width:1.7}
.gutter .chance{text-anchor:end}
.key{list-style:none;padding:0;max-width:none;color:var(--text-quiet);font-size:.9rem}
.key li{display:inline-block;margin-right:1.3rem}
.key svg{vertical-align:-.15em}
#shown.filled{position:sticky;bottom:0;background:var(--panel);border-top:2px solid var(--rule);
  padding:.5rem .8rem;
  min-height:3.4rem;font-size:.92rem;z-index:1}
#shown dl{display:flex;flex-wrap:wrap;gap:.1rem 1.4rem;margin:0;max-width:none}
#shown dt{display:inline;margin:0}
#shown dd{display:inline;margin:0 0 0 .35rem}
"""

_NARROW = """
@media screen and (max-width:44rem){
main,header,footer{padding:0 .75rem}
header{padding-top:1.2rem}
h1{font-size:1.5rem}
.verdict{font-size:1.25rem}
.rows thead{position:absolute;clip-path:inset(50%);width:1px;height:1px;overflow:hidden}
.rows,.rows tbody,.rows tr,.rows th,.rows td,.rows caption{display:block;border:0;padding:0}
.rows tr{border-bottom:1px solid var(--rule);padding:.45rem 0}
.rows th,.rows td{position:relative;padding-left:8rem;min-height:1.55em}
.rows th::before,.rows td::before{content:attr(data-head);color:var(--text-quiet);
  position:absolute;left:0;width:7.5rem}
.rows td:empty{display:none}
.share{width:4rem}
.short th,.short td{padding-right:.8rem}
#shown{margin:0 -.75rem;font-size:.85rem}
}
"""

_PRINT = """
@media print{
.halo{stroke:#fff}
.staff{orphans:1;widows:1;zoom:.76;margin-top:.6rem}
.piece{margin-bottom:.8rem}
.piece text{font-size:12px}
@page{size:A4;margin:14mm 12mm}
html{color-scheme:light;font-size:10.5pt}
body{background:none}
.ground,ellipse.mend{fill:#fff}
main,header,footer{max-width:none;padding:0}
#shown,.hint{display:none}
.folded::details-content{content-visibility:visible;block-size:auto}
.folded summary{list-style:none}
h2,h3,h4,summary,caption{break-after:avoid}
h2{margin-top:1.4rem}
tr,li,dd,.few,.key{break-inside:avoid}
.sides{grid-template-columns:1fr 1fr;gap:0 2rem}
.sides p,dt,thead,tbody tr:first-child,tbody tr:nth-last-child(2){break-after:avoid}
tbody tr:first-child,tbody tr:last-child{break-before:avoid}
thead{display:table-header-group}
a{color:inherit;text-decoration:none}
.share i{print-color-adjust:exact;-webkit-print-color-adjust:exact}
.scrolled{overflow:visible}
}
"""

STYLE = (
    _scheme(0)
    + f"@media screen and (prefers-color-scheme:dark){{{_scheme(1)}}}"
    + _TYPE
    + _TABLES
    + _CHART
    + _MODES
    + _NARROW
    + _PRINT
)
"""The style sheet of every page."""
