"use strict";
// Read-out of a figure under the pointer, or along it by the arrow keys. The page is complete without it.
for (const field of document.querySelectorAll(".field")) {
  const chart = field.closest(".chart");
  const out = chart.querySelector(".readout");
  const axis = (text) => { const [low, high, kind] = text.split(" "); return { low: +low, high: +high, decades: kind === "decades" }; };
  const x = axis(field.dataset.x), y = axis(field.dataset.y);
  const value = (a, at) => { const v = a.low + at * (a.high - a.low); return a.decades ? 10 ** v : v; };
  const short = (v) => Number(v.toPrecision(5)).toString();
  let lines = null, cursor = null, at = 0.5;
  const read = () => {
    lines = [...field.querySelectorAll("path[data-name]")].map((path) => ({
      path, name: path.dataset.name,
      points: path.getAttribute("d").split(/[ML]/).filter(Boolean).map((p) => p.split(" ").map(Number)),
    }));
    cursor = document.createElement("div");
    cursor.className = "cursor";
    field.append(cursor);
  };
  const show = () => {
    if (!lines) read();
    cursor.style.left = 100 * at + "%";
    const parts = [short(value(x, at)) + " " + field.dataset.xUnit];
    for (const { path, name, points } of lines) {
      if (!points.length || getComputedStyle(path).display === "none") continue;
      const place = 1000 * at;
      if (place < points[0][0] - 5 || place > points[points.length - 1][0] + 5) continue;
      let low = 0, high = points.length - 1;
      while (high - low > 1) { const mid = (low + high) >> 1; if (points[mid][0] < place) low = mid; else high = mid; }
      const near = place - points[low][0] < points[high][0] - place ? points[low] : points[high];
      parts.push(name + " " + short(value(y, 1 - near[1] / 1000)) + " " + field.dataset.yUnit);
    }
    out.textContent = parts.join("; ");
  };
  const move = (event) => {
    const box = field.getBoundingClientRect();
    at = Math.min(1, Math.max(0, (event.clientX - box.left) / box.width));
    show();
  };
  field.addEventListener("pointermove", move);
  field.addEventListener("pointerdown", move);
  field.addEventListener("keydown", (event) => {
    const step = event.shiftKey ? 0.05 : 0.005;
    if (event.key === "ArrowLeft") at = Math.max(0, at - step);
    else if (event.key === "ArrowRight") at = Math.min(1, at + step);
    else if (event.key === "Home") at = 0;
    else if (event.key === "End") at = 1;
    else return;
    event.preventDefault();
    show();
  });
}
