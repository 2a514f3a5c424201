"""How a build sheet looks: on paper, on a phone, in the dark. No script, nothing fetched."""

STYLE = """
:root { color-scheme: light dark; --ink: #1a1c1f; --page: #fff; --soft: #5c636b; --line: #c9ced4;
  --card: #f5f6f8; --mark: #1f6fb2; --allowed: #2f9e5b2e; --warn: #b3401f; }
@media (prefers-color-scheme: dark) { :root { --ink: #e6e8ea; --page: #15181b; --soft: #a4acb5;
  --line: #40474f; --card: #1e2226; --mark: #6cb3ee; --allowed: #3fbf6f33; --warn: #ff9472; } }
* { box-sizing: border-box; }
body { margin: 0 auto; padding: 1rem; max-width: 62rem; background: var(--page); color: var(--ink);
  font: 1rem/1.45 system-ui, "Segoe UI", "DejaVu Sans", sans-serif; overflow-wrap: break-word; }
h1 { font-size: 1.45rem; line-height: 1.2; margin: 0 0 .3rem; }
h2 { font-size: 1.12rem; margin: 0 0 .5rem; border-bottom: 1px solid var(--line); padding-bottom: .15rem; }
h3 { font-size: 1rem; margin: .8rem 0 .35rem; }
.card h3 { margin-top: 0; }
p { margin: .35rem 0; }
section { margin: 1.5rem 0 0; }
.soft, figcaption, thead th { color: var(--soft); }
.soft, figcaption { font-size: .9rem; }
table { border-collapse: collapse; width: 100%; font-size: .93rem; }
th, td { text-align: left; vertical-align: top; padding: .28rem .8rem .28rem 0; border-bottom: 1px solid var(--line); }
thead th { font-weight: 600; }
td { overflow-wrap: anywhere; }
td:first-child { min-width: 5.5rem; }
.figure { text-align: right; font-variant-numeric: tabular-nums; overflow-wrap: normal; }
.figure + td:not(.figure), .figure + th:not(.figure) { padding-left: 1rem; }
dl { display: grid; grid-template-columns: max-content minmax(0, 1fr); gap: .15rem 1rem; margin: 0; }
dt { color: var(--soft); }
dd { margin: 0; }
ul, ol { margin: .3rem 0; padding-left: 1.2rem; }
.cards { display: grid; grid-template-columns: repeat(auto-fit, minmax(min(20rem, 100%), 1fr)); gap: 1rem; }
.card { background: var(--card); border: 1px solid var(--line); border-radius: .4rem; padding: .8rem; }
figure { margin: 0; }
svg { display: block; max-width: 100%; height: auto; }
svg.picture { width: 100%; }
svg.picture text { font-family: inherit; }
svg.drawing text { font: 12px system-ui, "Segoe UI", "DejaVu Sans", sans-serif; fill: currentColor; }
svg.drawing text.strong { font-weight: 600; }
.wire, .plate, .thick, .faint { fill: none; stroke: currentColor; stroke-width: 1.3; stroke-linecap: round; }
.plate { stroke-width: 2; }
.thick { stroke: var(--mark); stroke-width: 5; }
.faint { stroke: var(--line); }
.dot { fill: var(--ink); stroke: var(--page); stroke-width: 1.5; }
.bar { fill: var(--mark); }
.allowed { fill: var(--allowed); }
.cautions { border-left: 4px solid var(--warn); padding-left: .9rem; }
@media screen and (max-width: 34rem) {
  thead { display: none; }
  table, tbody, tr, td { display: block; }
  tr { border-bottom: 1px solid var(--line); padding: .4rem 0; }
  td { border: 0; padding: .1rem 0; display: grid; grid-template-columns: 7.2rem minmax(0, 1fr); gap: .6rem; }
  td:empty { display: none; }
  td::before { content: attr(data-label); color: var(--soft); white-space: normal; }
  td:first-child { display: block; font-weight: 600; }
  td:first-child::before { content: none; }
  .figure { text-align: left; }
  .figure + td:not(.figure) { padding-left: 0; }
  dl { grid-template-columns: 7.2rem minmax(0, 1fr); gap: .15rem .6rem; }
}
@page { margin: 14mm; }
@media print {
  :root { color-scheme: light; --ink: #000; --page: #fff; --soft: #444; --line: #aaa; --card: #fff; --mark: #1f6fb2; }
  body { padding: 0; max-width: none; font-size: 10pt; }
  section { margin-top: 1.1rem; }
  h2, h3 { break-after: avoid; }
  tr, figure, .card, li { break-inside: avoid; }
  thead { display: table-header-group; }
  .cards { grid-template-columns: repeat(2, minmax(0, 1fr)); }
}
"""
