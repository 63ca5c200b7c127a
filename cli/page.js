"use strict";
// Reads points off the figures: by mouse, by touch, and by the arrow keys when a figure has the focus.
(() => {
  const SVG = "http://www.w3.org/2000/svg";
  const make = (name, parent, kind) => {
    const node = document.createElementNS(SVG, name);
    node.setAttribute("class", kind);
    node.setAttribute("visibility", "hidden");
    return parent.appendChild(node);
  };
  const start = (plot) => {
    const data = JSON.parse(document.getElementById(plot.dataset.points).textContent);
    const svg = plot.querySelector("svg");
    const said = document.getElementById(plot.dataset.said);
    if (!data.series.length) return;
    // from left to right, whichever way it was measured
    const orders = data.series.map((s) => s.x.map((_, i) => i).sort((a, b) => s.x[a] - s.x[b]));
    const line = make("line", svg, "reader-line");
    const dot = make("circle", svg, "reader-dot");
    dot.setAttribute("r", "4");
    line.setAttribute("y1", "0");
    line.setAttribute("y2", String(data.h));
    let series = 0;
    let rank = -1;
    const show = () => {
      const own = data.series[series];
      const i = orders[series][rank];
      dot.setAttribute("cx", String(own.x[i]));
      dot.setAttribute("cy", String(own.y[i]));
      line.setAttribute("x1", String(own.x[i]));
      line.setAttribute("x2", String(own.x[i]));
      dot.setAttribute("visibility", "visible");
      line.setAttribute("visibility", data.line ? "visible" : "hidden");
      said.textContent = (own.name ? own.name + ": " : "") + own.said[i];
    };
    const hide = () => {
      for (const node of [dot, line]) node.setAttribute("visibility", "hidden");
    };
    const seek = (event) => {
      const box = svg.getBoundingClientRect();
      const px = ((event.clientX - box.left) / box.width) * data.w;
      const py = ((event.clientY - box.top) / box.height) * data.h;
      let best = Infinity;
      data.series.forEach((own, s) => {
        if (data.line && s !== series) return;
        orders[s].forEach((i, r) => {
          const away = data.line ? Math.abs(own.x[i] - px) : Math.hypot(own.x[i] - px, own.y[i] - py);
          if (away < best) {
            best = away;
            series = s;
            rank = r;
          }
        });
      });
      show();
    };
    plot.addEventListener("pointermove", (event) => {
      if (event.pointerType === "mouse" || event.buttons) seek(event);
    });
    plot.addEventListener("pointerdown", seek);
    plot.addEventListener("keydown", (event) => {
      const last = orders[series].length - 1;
      const step = event.shiftKey ? Math.max(1, Math.round(last / 20)) : 1;
      const moves = {
        ArrowRight: () => (rank < 0 ? 0 : Math.min(last, rank + step)),
        ArrowLeft: () => (rank < 0 ? last : Math.max(0, rank - step)),
        Home: () => 0,
        End: () => last,
      };
      if (event.key === "Escape") {
        hide();
        return;
      }
      if (event.key === "ArrowUp" || event.key === "ArrowDown") {
        if (data.series.length < 2) return;
        const turn = event.key === "ArrowUp" ? 1 : data.series.length - 1;
        series = (series + turn) % data.series.length;
        rank = Math.min(Math.max(rank, 0), orders[series].length - 1);
      } else if (event.key in moves && !event.ctrlKey && !event.altKey && !event.metaKey) {
        rank = moves[event.key]();
      } else return;
      event.preventDefault();
      show();
    });
  };
  for (const plot of document.querySelectorAll("[data-points]")) start(plot);
})();
