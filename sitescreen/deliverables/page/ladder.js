// The ladder down the map's right edge: a ruler 0–100, the shortlist on it, and a thin line from each tick to its ground.
const ladder = (() => {
  const { data, plots, make, draw, state } = page;
  const INK = "#2b2a27", SOFT = "#6a6457";
  const MOST = 12, TOP = 16, BOTTOM = 14, ROW = 33, LANE = 5, SLIDE_MS = 380;
  const X = { hairs: 2, numerals: 37, band: 41, wide: 7, tick: 51, lanes: 55, labels: 92 };
  const holder = document.getElementById("ladder"), list = document.getElementById("ladder-list"), svg = document.getElementById("ladder-lines");
  const head = document.getElementById("ladder-head"), note = document.getElementById("ladder-note");
  const canvas = document.createElement("canvas");
  canvas.className = "leaders leaflet-zoom-hide";
  const isCalm = window.matchMedia("(prefers-reduced-motion: reduce)"), isNarrow = window.matchMedia("screen and (max-width: 760px)");
  const isList = () => isNarrow.matches && !document.body.classList.contains("on-paper");
  let rungs = [], hairs = [], at = new Map(), sliding = 0, height = 0;

  const top = (mark) => TOP + ((100 - mark) / 100) * (height - TOP - BOTTOM);
  // the shortlist as it stands now, and the chosen plot
  function shown() {
    const now = page.now, out = now.order.filter((i) => now.rank[i] <= Math.min(MOST, data.shortlist)).slice(0, MOST);
    if (state.chosen !== null && now.rank[state.chosen] !== null && !out.includes(state.chosen)) out.push(state.chosen);
    return out;
  }
  function rangeWords(i) {
    const best = plots.rank_low[i], worst = plots.rank_high[i];
    if (best === null || worst === null) return "";
    return best === worst ? `stays ${page.ordinal(best)}` : `${page.ordinal(best)} to ${page.ordinal(worst)}`;
  }

  // places for the labels: as near their ticks as they fit, none over another
  function spread(wanted, from, to) {
    const groups = [];
    for (const y of wanted) {
      groups.push({ sum: y, n: 1 });
      for (;;) {
        const last = groups[groups.length - 1], above = groups[groups.length - 2];
        const start = (g) => Math.min(Math.max(g.sum / g.n - ((g.n - 1) * ROW) / 2, from), to - (g.n - 1) * ROW);
        if (!above || start(above) + above.n * ROW <= start(last)) break;
        groups.pop();
        groups[groups.length - 1] = { sum: above.sum + last.sum, n: above.n + last.n };
      }
    }
    return groups.flatMap((g) => {
      const start = Math.min(Math.max(g.sum / g.n - ((g.n - 1) * ROW) / 2, from), to - (g.n - 1) * ROW);
      return Array.from({ length: g.n }, (_, k) => start + k * ROW);
    });
  }

  function layOut() {
    const marks = page.marks(), one = page.question();
    const items = shown().map((i) => ({ i, mark: marks[i], low: one ? null : page.now.low[i], high: one ? null : page.now.high[i] }));
    // unknown marks stand below the ruler's end
    const whole = (item) => Math.floor((item.mark ?? -1) + 0.5);
    items.sort((a, b) => whole(b) - whole(a) || page.now.rank[a.i] - page.now.rank[b.i]);
    // without a mark there is no tick: such plots stand in the list only, at its foot
    const ys = spread(items.map((item) => (item.mark === null ? height : top(item.mark))), TOP + 8, height - BOTTOM - 10);
    const ends = [];
    items.forEach((item, k) => {
      item.label = ys[k];
      item.lane = -1;
      if (item.low === null || item.high === null || item.high - item.low < 0.5) return;
      item.lane = ends.findIndex((end) => end < top(item.high) - 2);
      if (item.lane < 0) item.lane = ends.length < 6 ? ends.length : 5;
      ends[item.lane] = top(item.low);
    });
    return items;
  }

  function label(item) {
    const rank = page.now.rank[item.i], range = rangeWords(item.i), isChosen = item.i === state.chosen;
    const name = plots.name[item.i] === null ? `Plot ${plots.plot[item.i]}` : plots.name[item.i];
    const mark = item.mark === null ? (page.asks(item.i) ? "unknown" : "not asked") : String(Math.floor(item.mark + 0.5));
    return make("li", { class: isChosen ? "chosen" : null, "data-plot": item.i },
      make("button", { type: "button", "aria-current": isChosen ? "true" : null, onclick: () => page.change({ chosen: item.i }) },
        make("b", {}, page.ordinal(rank)), make("bdi", { class: "name" }, name), make("span", { class: "mark" }, mark),
        range ? make("small", { class: "sure" }, range) : null),
      page.ruler(item.mark, item.low, item.high, 300, 14));
  }

  // where the lines stand at one moment of a slide: mark and label of every rung
  function drawLines() {
    const line = (x0, y0, x1, y1, stroke, wide) => draw("line", { x1: x0, y1: y0, x2: x1, y2: y1, stroke, "stroke-width": wide });
    const parts = [], from = document.body.classList.contains("on-paper") ? -20 : 0; // browsers print a canvas a little too narrow
    const edges = [0, ...data.edges, 100];
    for (let k = 0; k < 5; k++) {
      parts.push(draw("rect", { x: X.band, y: top(edges[k + 1]), width: X.wide, height: top(edges[k]) - top(edges[k + 1]), fill: data.ramp[k] }));
    }
    parts.push(draw("rect", { x: X.band, y: top(100), width: X.wide, height: top(0) - top(100), fill: "none", stroke: INK, "stroke-width": 1 }));
    parts.push(...hairs.map(([y, wide]) => line(X.hairs, y, X.hairs + wide, y, SOFT, 1)));
    for (const rung of rungs) {
      if (rung.mark === null) continue;
      const y = at.get(rung.i).y, labelY = at.get(rung.i).label, isChosen = rung.i === state.chosen;
      const out = rung.lane < 0 ? X.tick + 2 : X.lanes + (rung.lane + 1) * LANE;
      if (rung.lane >= 0) {
        const x = X.lanes + rung.lane * LANE, start = y + top(rung.high) - top(rung.mark), to = y + top(rung.low) - top(rung.mark);
        parts.push(draw("path", { d: `M${x - 3} ${start} H${x} V${to} H${x - 3}`, fill: "none", stroke: INK, "stroke-width": isChosen ? 1.6 : 1 }));
      }
      if (plan.groundOf(rung.i)) parts.push(line(from, y, X.band, y, INK, isChosen ? 1.5 : 0.8));
      parts.push(line(X.band - 3, y, X.tick, y, "#faf7f0", isChosen ? 6 : 4.6), line(X.band - 3, y, X.tick, y, INK, isChosen ? 3.4 : 2.2));
      parts.push(draw("path", { d: `M${out} ${y} L${X.labels - 12} ${labelY} H${X.labels - 4}`, fill: "none", stroke: INK, "stroke-width": isChosen ? 1.2 : 0.7 }));
    }
    for (const edge of edges) {
      const numeral = draw("text", { x: X.numerals, y: top(edge) + 3.5, "text-anchor": "end", class: "numeral" }, String(edge));
      parts.push(numeral);
    }
    svg.replaceChildren(...parts);
  }

  // the other plots, as hairs; many of them as the lengths of a hundred bins
  function others() {
    const marks = page.marks(), inLadder = new Set(rungs.map((rung) => rung.i));
    const rest = page.now.order.filter((i) => !inLadder.has(i) && marks[i] !== null);
    if (rest.length <= 150) return rest.map((i) => [top(marks[i]), 12]);
    const bins = new Array(101).fill(0);
    for (const i of rest) bins[Math.round(marks[i])]++;
    const most = Math.max(...bins);
    return bins.flatMap((n, mark) => (n ? [[top(mark), 1.5 + (12.5 * n) / most]] : []));
  }

  function drawLeaders() {
    const size = window.map_plan.getSize(), sharp = window.devicePixelRatio || 1;
    canvas.width = size.x * sharp;
    canvas.height = size.y * sharp;
    canvas.style.width = `${size.x}px`;
    canvas.style.height = `${size.y}px`;
    L.DomUtil.setPosition(canvas, window.map_plan.containerPointToLayerPoint([0, 0]));
    if (isList() || window.map_plan.getContainer().classList.contains("printing")) return;
    const pen = canvas.getContext("2d");
    pen.scale(sharp, sharp);
    paintLeaders(pen, size);
  }
  function paintLeaders(pen, size) {
    for (const rung of [...rungs].sort((a, b) => (a.i === state.chosen) - (b.i === state.chosen))) {
      const ground = plan.groundOf(rung.i);
      if (!ground || rung.mark === null) continue;
      const y = at.get(rung.i).y + svg.getBoundingClientRect().top - window.map_plan.getContainer().getBoundingClientRect().top - 1;
      const far = Math.hypot(size.x - ground.x, y - ground.y) || 1, isChosen = rung.i === state.chosen;
      const out = ground.half + (isChosen ? 6 : 1);
      if (far <= out) continue;
      pen.beginPath();
      pen.moveTo(ground.x + ((size.x - ground.x) * out) / far, ground.y + ((y - ground.y) * out) / far);
      pen.lineTo(size.x, y);
      pen.strokeStyle = "rgba(250,247,240,0.75)";
      pen.lineWidth = isChosen ? 4 : 2.8;
      pen.stroke();
      pen.strokeStyle = INK;
      pen.lineWidth = isChosen ? 1.5 : 0.8;
      pen.stroke();
    }
  }

  function place() {
    for (const item of list.children) {
      const where = at.get(Number(item.dataset.plot));
      if (where) item.style.transform = isList() ? "" : `translateY(${where.label - ROW / 2}px)`;
    }
    drawLines();
    drawLeaders();
  }

  // ticks slide from where they stood to where they stand now, while the ground stays
  function show(isSlide) {
    height = svg.clientHeight || Math.max(200, window.map_plan.getSize().y - 70);
    const before = at;
    rungs = layOut();
    hairs = others();
    const after = new Map(rungs.map((rung) => [rung.i, { y: top(rung.mark ?? 0), label: rung.label }]));
    list.replaceChildren(...rungs.map(label));
    const one = page.question();
    head.textContent = `${one ? `Mark for ${words.noun(one)}` : "Overall mark"}, of 100`;
    cancelAnimationFrame(sliding);
    sliding = 0;
    at = after;
    if (isSlide && !isCalm.matches && before.size) {
      const start = performance.now();
      const step = (moment) => {
        const t = Math.min(1, Math.max(0, (moment - start) / SLIDE_MS)), ease = 1 - (1 - t) ** 3;
        at = new Map(rungs.map(({ i }) => {
          const to = after.get(i), from = before.get(i) || to;
          return [i, { y: from.y + (to.y - from.y) * ease, label: from.label + (to.label - from.label) * ease }];
        }));
        place();
        sliding = t < 1 ? requestAnimationFrame(step) : 0;
      };
      step(start);
    } else {
      place();
    }
  }

  function start() {
    holder.hidden = false;
    window.map_plan.createPane("leaders").style.zIndex = 440;
    window.map_plan.getPane("leaders").append(canvas);
    const hasRange = plots.rank_low.some((rank) => rank !== null), hasSpread = page.ranked.some((i) => plots.mark_high[i] - plots.mark_low[i] >= 0.5);
    note.textContent = [
      hasRange ? "Under a name: its ranks in 90 of 100 trials." : "",
      hasSpread ? "Bracket: where its mark may lie, as its unknowns turn out." : "",
      page.ranked.length > shown().length ? "Hairs: the other plots." : "",
    ].filter((part) => part).join(" ");
    plan.movers.push(() => { if (at.size) { drawLines(); drawLeaders(); } });
    window.map_plan.on("resize", () => show(false));
    page.watchers.push((what) => show("weights" in what || "question" in what));
    show(false);
  }
  return { start, show, isStill: () => !sliding, paintLeaders, shown, rungs: () => rungs, places: () => at };
})();
