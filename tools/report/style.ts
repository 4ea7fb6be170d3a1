/** Style of a report: screen in light and dark, A4 paper in light. Nothing is told by colour alone. */
export const style = `
:root{color-scheme:light dark;--ground:#fbfaf7;--paper:#fff;--ink:#1d2327;--quiet:#5c666d;--line:#d9d7d0;--soft:#f0eee8;
--pass:#1f6f43;--fail:#b3261e;--open:#8a5a00;--none:#4a5a78;--setting:#b3261e;--mark:#6b4fa0;
--t0:#0b5fa5;--t1:#b35c00;--t2:#2e7d32;--t3:#8e24aa;--t4:#00796b;--t5:#795548;--in:#3d7ea6;--store:#c59a2f;--lost:#b0655a}
@media (prefers-color-scheme:dark){:root{--ground:#14181b;--paper:#1b2024;--ink:#e6e4de;--quiet:#9aa5ad;--line:#343c42;--soft:#232a2f;
--pass:#6cc797;--fail:#ff8f85;--open:#e7b44d;--none:#a9bbe0;--setting:#ff8f85;--mark:#bda6f0;
--t0:#6db5f0;--t1:#f0a35a;--t2:#7fcf86;--t3:#d393e8;--t4:#5fc9ba;--t5:#c9a393;--in:#5a9fc9;--store:#c9a24a;--lost:#c27f74}}
*{box-sizing:border-box}
body{margin:0;background:var(--ground);color:var(--ink);font:15px/1.5 system-ui,"Segoe UI","Liberation Sans",sans-serif;font-variant-numeric:tabular-nums}
main{max-width:960px;margin:0 auto;padding:24px 20px 64px}
h1{font-size:26px;line-height:1.2;margin:0 0 2px;overflow-wrap:anywhere}h2{font-size:19px;margin:40px 0 10px;padding-top:10px;border-top:2px solid var(--ink)}
h3{font-size:15px;margin:22px 0 6px;overflow-wrap:anywhere}p{margin:6px 0}a{color:inherit}
.quiet,.meta{color:var(--quiet)}nav{margin:14px 0 0;display:flex;flex-wrap:wrap;gap:4px 16px;font-size:14px}
.verdict{display:flex;gap:16px;align-items:center;margin:18px 0 4px;padding:14px 18px;background:var(--paper);border:1px solid var(--line);border-left:8px solid var(--none)}
.verdict.pass{border-left-color:var(--pass)}.verdict.fail{border-left-color:var(--fail)}.verdict.open{border-left-color:var(--open)}
.verdict .word{font-size:24px;font-weight:700;white-space:nowrap}.pass .word,.word.pass{color:var(--pass)}.fail .word,.word.fail{color:var(--fail)}.open .word,.word.open{color:var(--open)}.none .word,.word.none{color:var(--none)}
.facts{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(100%,400px),1fr));gap:0 32px;margin:14px 0}
.facts div{display:flex;gap:10px;border-bottom:1px solid var(--line);padding:4px 0}.facts dt{flex:0 0 112px;color:var(--quiet)}.facts dd{margin:0;overflow-wrap:anywhere;min-width:0}dl{margin:0}
.scroll{overflow-x:auto}table{border-collapse:collapse;width:100%;font-size:14px;background:var(--paper);border:1px solid var(--line)}
th,td{text-align:left;padding:6px 10px;border-bottom:1px solid var(--line);vertical-align:top}th{font-weight:600;color:var(--quiet);font-size:13px;white-space:nowrap}
td.n,th.n{text-align:right;white-space:nowrap}td.w{white-space:nowrap}td.name{min-width:12em}tr:target td{background:var(--soft)}.wrap{overflow-wrap:anywhere}
.word{font-weight:650;white-space:nowrap}code,.code{font:13px/1.45 ui-monospace,"Liberation Mono",monospace;overflow-wrap:anywhere}.formula{display:block;color:var(--quiet);margin-top:2px}
pre.code{background:var(--soft);padding:10px 12px;margin:8px 0;white-space:pre-wrap}
figure{margin:4px 0 10px;background:var(--paper);border:1px solid var(--line);padding:8px 6px 4px}figcaption{font-size:13px;color:var(--quiet);padding:0 8px 2px;min-height:20px;overflow-wrap:anywhere}
svg{display:block;width:100%;height:auto;font-family:inherit}svg text{fill:var(--ink);font-size:10.5px}svg .axis,svg tspan.quiet{fill:var(--quiet)}svg .small{font-size:9.5px}
.field{fill:none;stroke:var(--line)}.grid{stroke:var(--line);stroke-width:.6;fill:none}.setting{stroke:var(--setting);stroke-width:1.2;stroke-dasharray:6 3;fill:none}svg .settingText{fill:var(--setting)}
.mark{stroke:var(--mark);stroke-width:1.1;fill:none}svg .markText{fill:var(--mark);paint-order:stroke;stroke:var(--paper);stroke-width:3px}.trace{fill:none;stroke-width:1.4;stroke-linejoin:round}
.trace.t0{stroke:var(--t0)}.trace.t1{stroke:var(--t1)}.trace.t2{stroke:var(--t2)}.trace.t3{stroke:var(--t3)}.trace.t4{stroke:var(--t4)}.trace.t5{stroke:var(--t5)}
svg .name.t0{fill:var(--t0)}svg .name.t1{fill:var(--t1)}svg .name.t2{fill:var(--t2)}svg .name.t3{fill:var(--t3)}svg .name.t4{fill:var(--t4)}svg .name.t5{fill:var(--t5)}
.bar{fill:var(--t0)}.cursor{stroke:var(--ink);stroke-width:.8;fill:none}.pick{fill:var(--mark);opacity:.18}
.trunk{fill:var(--ink)}svg .trunkText{fill:var(--ground);font-size:13px;font-weight:600}svg .trunkText.small{font-size:9.5px;font-weight:400}svg .side{font-size:12px;font-weight:600}
.stream{opacity:.78}.supplied,.taken{fill:var(--in)}.fromStore,.toStore{fill:var(--store)}.lost{fill:var(--lost)}
.caution{margin-top:40px;padding:12px 16px;border:2px solid var(--ink)}details summary{cursor:pointer}.script-only{display:none}.scripted .script-only{display:block}
.plot[data-plot]{touch-action:pan-y}.scripted .plot[data-plot]{cursor:crosshair}
@media (max-width:560px){.verdict{flex-direction:column;align-items:flex-start;gap:2px}main{padding:14px 12px 40px}}
@page{size:A4;margin:16mm 14mm 18mm}
@media print{:root{color-scheme:light;--ground:#fff;--paper:#fff;--ink:#000;--quiet:#444;--line:#bbb;--soft:#f2f2f2;--pass:#1f6f43;--fail:#b3261e;--open:#8a5a00;--none:#4a5a78;--setting:#b3261e;--mark:#6b4fa0;--t0:#0b5fa5;--t1:#b35c00;--t2:#2e7d32;--t3:#8e24aa;--t4:#00796b;--t5:#795548;--in:#3d7ea6;--store:#c59a2f;--lost:#b0655a}
body{font-size:10.5pt;print-color-adjust:exact;-webkit-print-color-adjust:exact}main{max-width:none;padding:0}nav,.script-only,.scripted .script-only{display:none}h2{margin-top:22px;break-after:avoid}h3{break-after:avoid}figure,tr,.verdict,.caution{break-inside:avoid}thead{display:table-header-group}table{font-size:9pt}.scroll{overflow:visible}.facts{grid-template-columns:1fr 1fr}}
`;
