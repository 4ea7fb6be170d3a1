/**
 * Runs in the reader's browser; the report is complete without it. Cursor with values under the pointer, dragging zooms, a double click
 * or Escape goes back; arrow keys move the cursor of a focused plot. Draws only numbers, writes only text nodes.
 */
export const script = `
(function(){
'use strict';
var all=JSON.parse(document.getElementById('samples').textContent);
var F=all.frame,W=F.width-F.left-F.right,H=F.height-F.top-F.bottom,NS='http://www.w3.org/2000/svg';
document.documentElement.classList.add('scripted');
document.querySelectorAll('svg[data-plot]').forEach(function(svg){
  var p=all.plots[+svg.dataset.plot];if(!p)return;
  var from=p.from,to=p.to,caption=svg.parentNode.querySelector('figcaption'),said=caption?caption.textContent:'';
  var group=svg.querySelector('.traces'),paths=group.querySelectorAll('path'),at=null,start=null;
  var fixed=Array.prototype.filter.call(svg.querySelectorAll('.grid,.axis,.mark,.markText'),function(e){return /V|v|middle/.test((e.getAttribute('d')||'')+(e.getAttribute('text-anchor')||''))||/mark/.test(e.getAttribute('class'))});
  var clip=make('clipPath',{id:'clip'+svg.dataset.plot});clip.appendChild(make('rect',{x:F.left,y:F.top,width:W,height:H}));svg.appendChild(clip);group.setAttribute('clip-path','url(#clip'+svg.dataset.plot+')');
  var cursor=make('path',{class:'cursor'}),pick=make('rect',{class:'pick',y:F.top,height:H,width:0});svg.appendChild(pick);svg.appendChild(cursor);
  svg.setAttribute('tabindex','0');
  function make(n,a){var e=document.createElementNS(NS,n);for(var k in a)e.setAttribute(k,a[k]);return e}
  function X(t){return F.left+(t-from)/(to-from)*W}
  function Y(v){return F.top+(1-(v-p.least)/(p.greatest-p.least))*H}
  function T(event){var r=svg.getBoundingClientRect();var x=(event.clientX-r.left)/r.width*F.width;return from+Math.min(1,Math.max(0,(x-F.left)/W))*(to-from)}
  function near(t,list){var a=0,b=list.length-1;while(b-a>1){var m=(a+b)>>1;if(list[m]<=t)a=m;else b=m}return t-list[a]<=list[b]-t?a:b}
  function draw(){
    var whole=from===p.from&&to===p.to;
    fixed.forEach(function(e){e.style.display=whole?'':'none'});
    p.traces.forEach(function(trace,i){var d='';for(var k=0;k<trace.t.length;k++){if((trace.t[k+1]<from)||(trace.t[k-1]>to))continue;d+=(d?'L':'M')+X(trace.t[k]).toFixed(1)+' '+Y(trace.y[k]).toFixed(1)}paths[i].setAttribute('d',d)});
    if(whole)show(null);else if(caption)caption.textContent=from.toFixed(4)+' s to '+to.toFixed(4)+' s';
  }
  function show(t){
    at=t;
    if(t===null){cursor.removeAttribute('d');if(caption)caption.textContent=said;return}
    cursor.setAttribute('d','M'+X(t).toFixed(1)+' '+F.top+'v'+H);
    if(caption)caption.textContent=t.toFixed(4)+' s:  '+p.traces.map(function(trace){return trace.t.length?trace.path+' '+(+trace.y[near(t,trace.t)].toPrecision(5))+' '+p.unit:''}).join(',  ');
  }
  svg.addEventListener('pointermove',function(e){var t=T(e);show(t);if(start!==null){pick.setAttribute('x',Math.min(X(t),X(start)));pick.setAttribute('width',Math.abs(X(t)-X(start)))}});
  svg.addEventListener('pointerleave',function(){if(start===null)show(null)});
  svg.addEventListener('pointerdown',function(e){if(e.button)return;start=T(e);svg.setPointerCapture(e.pointerId)});
  svg.addEventListener('pointerup',function(e){if(start===null)return;var t=T(e),a=Math.min(t,start),b=Math.max(t,start);start=null;pick.setAttribute('width',0);if((b-a)/(to-from)>.01){from=a;to=b;draw()}});
  function back(){from=p.from;to=p.to;draw()}
  svg.addEventListener('dblclick',back);
  svg.addEventListener('keydown',function(e){
    if(e.key==='Escape')back();
    else if(e.key==='ArrowLeft'||e.key==='ArrowRight'){e.preventDefault();var s=(to-from)/200*(e.key==='ArrowLeft'?-1:1);show(Math.min(to,Math.max(from,(at===null?(from+to)/2:at)+s)))}
  });
});
})();
`;
