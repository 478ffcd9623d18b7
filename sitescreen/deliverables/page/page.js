// The row of questions, the legend, how far to trust it; then everything starts.
(() => {
  const { data, make, state } = page;
  const legend = document.getElementById("legend");

  function showLegend() {
    const one = page.question(), view = one && one.views[state.view];
    const items = [];
    if (view) {
      for (const range of view.ranges) {
        const isBare = view.bare && range.class === 4;
        if (range.words) items.push([page.sign(isBare ? "bare" : range.class), isBare ? `${range.words}, left bare` : range.words]);
      }
    } else {
      for (const number of [4, 3, 2, 1, 0]) items.push([page.sign(number), `${[0, ...data.edges][number]}–${[...data.edges, 100][number]}`]);
    }
    if (page.ranked.some((i) => page.marks()[i] === null && !page.asks(i))) items.push([page.sign("unasked"), "not asked in its zone"]);
    if (page.ranked.some((i) => page.marks()[i] === null && page.asks(i))) items.push([page.sign("unknown"), "unknown"]);
    if (page.aside.length) items.push([page.sign("aside"), "set aside"]);
    const zonesOf = (each) => each.zones.map((zone) => data.zones[zone].title.toLowerCase()).join(", ");
    const judged = (each) => (each.zones.length ? `${each.title}, judged for ${zonesOf(each)}` : each.title);
    const title = make("div", { class: "legend-title" });
    if (one && one.views.length > 1) {
      title.append(`${view.title}, judged for `, make("span", { class: "legend-views" }, ...one.views.map((each, k) => make("button", { type: "button",
        "aria-pressed": String(k === state.view), onclick: () => page.change({ view: k }) }, zonesOf(each)))));
    } else if (view) {
      title.append(judged(view));
    } else {
      title.append(one ? `Plots by their mark for ${one.column.toLowerCase()}, of 100` : "Plots by their overall mark, of 100");
    }
    const best = view && view.bare ? "Bare ground is best, then dark ground." : "Dark ground is better ground.";
    const darker = view ? `${best} Plots show their own mark, by their own zone, in the same five steps.` : "Dark is better.";
    legend.hidden = false;
    const way = [...coldAir.key(), ...landmarks.key()];
    legend.replaceChildren(
      make("div", { class: "legend-row" }, title, ...items.map(([sign, words]) => make("span", { class: "legend-item" }, sign, words)),
        ...way.map((parts) => make("span", { class: "legend-item" }, ...parts))),
      make("p", {}, `${darker} 1st, 2nd … on the map are ranks; a plot’s own number stands in its leaf. ${coldAir.says()} ${(one || data.overall).method} ${data.left_out.join(" ")}`.trim()));
  }

  function trust() {
    document.getElementById("trust").replaceChildren(...data.trust.map((block) => make("div", {}, make("h3", {}, block.heading),
      make("ul", {}, ...block.lines.map((line) => make("li", {}, line))))));
  }

  document.body.classList.toggle("many", page.count > 400);
  asks.start();
  trust();
  landmarks.start();
  plan.start();
  ladder.start();
  ranking.start();
  paper.start();
  page.watchers.push((what) => {
    if ("question" in what || "view" in what) showLegend();
    if ("chosen" in what && state.chosen !== null) plan.reveal(state.chosen);
  });
  showLegend();
  page.change({ chosen: page.ranked.length ? page.ranked[0] : page.aside.length ? page.aside[0] : null });
  document.documentElement.dataset.ready = "yes";
})();
