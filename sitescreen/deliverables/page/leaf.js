// The plot's leaf, docked beside or below the map: what speaks for it, what against, its marks and readings.
const leaf = (() => {
  const { data, plots, make, ruler } = page;
  const holder = document.getElementById("leaf");
  const readingNamed = new Map(data.readings.map((reading) => [reading.name, reading]));

  const strips = []; // drawn below the words, each made by a function of the plot that may give nothing

  function list(heading, lines, kind) {
    if (!lines.length) return [];
    return [make("h3", {}, heading), make("ul", { class: kind }, ...lines.map((line) => make("li", {}, line)))];
  }

  function top(i) {
    const order = [...page.now.order, ...page.aside], now = page.now;
    const place = order.indexOf(i), rank = now.rank[i], isAside = plots.rank[i] === null;
    const isShared = rank !== null && now.rank.filter((other) => other === rank).length > 1 ? ", shared" : "";
    const inZone = now.rankInZone[i] === null || rank === null ? "" : `, ${page.ordinal(now.rankInZone[i])} in its zone`;
    const turn = (text, to) => make("button", { type: "button", disabled: to < 0 || to >= order.length, onclick: () => page.change({ chosen: order[to] }) }, text);
    const title = document.getElementById("title").textContent, caution = document.querySelector(".caution").textContent;
    return make("div", { class: "leaf-top" },
      make("span", { class: "on-leaf" }, title),
      make("span", { class: "place" }, isAside ? "Set aside" : rank === null ? "No rank: nothing that its zone asks for counts" : `${page.ordinal(rank)} of ${page.ranked.length}${isShared}${inZone}`),
      make("span", { class: "turn" }, turn("previous", place - 1), turn("next", place + 1)), make("span", { class: "on-leaf" }, caution));
  }

  function markLine(i) {
    const mark = page.now.mark[i], low = page.now.low[i], high = page.now.high[i];
    if (mark === null || plots.rank[i] === null) return null;
    const spread = low === null || high === null || high - low < 0.05 ? "of 100; nothing it needs is unknown"
      : low.toFixed(0) === high.toFixed(0) ? "of 100; its unknowns hardly matter"
      : `of 100; ${low.toFixed(0)} to ${high.toFixed(0)}, as its unknowns may turn out`;
    const [whole, ...atWorst] = page.markWords(i).split(/(?= )/), words = [whole, make("small", {}, atWorst.join(""))];
    return make("div", { class: "leaf-mark" }, make("b", {}, ...words), make("div", {}, ruler(mark, low, high, 300, 22), make("span", {}, spread)));
  }

  function sureLine(i) {
    const rank = plots.rank[i], best = plots.rank_low[i], worst = plots.rank_high[i];
    if (rank === null || best === null || worst === null) return null;
    const range = best === worst ? `${best === rank ? "the same" : page.ordinal(best)} in at least 90 of 100 trials` : `${page.ordinal(best)} to ${page.ordinal(worst)} in 90 of 100 trials`;
    const alike = plots.alike[i] ? ` ${plots.alike[i]} cannot be told apart.` : "";
    return make("p", { class: "leaf-zone leaf-sure sure" }, `${page.ordinal(rank)}; ${range}, which vary ${data.varies}.${alike}`);
  }

  function criteria(i) {
    const zone = data.zones[plots.zone[i]];
    if (!zone || zone.criteria.every((one) => !data.marks[one.name] || data.marks[one.name][i] === null)) return [];
    const rows = zone.criteria.map((one) => {
      const marks = data.marks[one.name], mark = marks ? marks[i] : null, reading = readingNamed.get(one.reading);
      return make("tr", {},
        make("td", {}, one.title, reading ? make("span", {}, ` ${page.shown(reading, reading.values[i])}`) : null),
        make("td", {}, ruler(mark, null, null, 92, 12)),
        make("td", {}, mark === null ? "?" : mark.toFixed(0)));
    });
    return [make("h3", {}, "What its zone asks for, and its marks"), make("table", { class: "criteria" }, make("tbody", {}, ...rows))];
  }

  function readings(i) {
    const items = [];
    for (const reading of data.readings) {
      const words = page.readingWords(reading, i);
      if (words !== null) items.push(make("div", {}, make("dt", { title: reading.says }, reading.title), make("dd", {}, words)));
    }
    if (data.reasons[i] === null) return null;
    if (data.readings.every((reading) => reading.values[i] === null || reading.name === "area_ha")) {
      return make("p", { class: "leaf-zone" }, "It has no readings.");
    }
    return make("details", {}, make("summary", {}, "All readings"), make("dl", { class: "readings" }, ...items));
  }

  // the drawings do not hang on the weights: the last ones serve again while plot and room stay the same
  let last = { i: null, width: 0, parts: [] };
  function drawn(i, width) {
    const made = () => [...strips.flatMap((strip) => strip(i, width)), readings(i)].filter((part) => part);
    if (document.body.classList.contains("on-paper")) return made();
    if (last.i !== i || last.width !== width) last = { i, width, parts: made() };
    return last.parts;
  }

  // everything a leaf holds, as wide as its holder
  function parts(i, width) {
    const why = data.reasons[i], zone = data.zones[plots.zone[i]];
    const share = plots.zone_share[i];
    const about = [make("h2", { class: "leaf-name" }, make("bdi", {}, plots.name[i] === null ? `Plot ${plots.plot[i]}` : plots.name[i]))];
    const mixed = share !== null && share < 0.95 ? `, ${(100 * share).toFixed(0)} % of the judgement` : "";
    const line = (text) => make("p", { class: "leaf-zone" }, text);
    about.push(line([plots.name[i] === null ? null : `Plot ${plots.plot[i]}`, page.zoneTitle(i) ? page.zoneTitle(i) + mixed : null].filter((word) => word).join(" · ")));
    if (plots.zone_missing[i]) about.push(line(`The zone is not firm; missing: ${plots.zone_missing[i]}.`));
    if (zone) about.push(line(`What it wants: ${zone.wants}`));
    about.push(markLine(i), sureLine(i));
    const reasons = [], doubts = [];
    if (plots.set_aside[i]) reasons.push(...list("Why it is set aside", [plots.set_aside[i]], "alerts"));
    if (why) {
      reasons.push(...list("For it", why.for, "for"), ...list("Against it", why.against, "against"));
      doubts.push(...list("Cautions", why.cautions, "alerts"), ...list("Unknown", why.unknown, "unknown"));
    } else if (plots.rank[i] !== null) {
      reasons.push(line("This page holds reasons and readings of the leading plots only; those of this one are in ranking.csv."));
    }
    doubts.push(...criteria(i));
    if (data.siting[i]) reasons.push(...list("How to place a house here", data.siting[i].says, "siting"));
    const column = (kind, parts) => make("div", { class: kind }, ...parts.filter((part) => part));
    return [top(i), make("div", { class: "leaf-columns" }, column("about", about), column("reasons", reasons), column("doubts", doubts)),
      ...drawn(i, width)];
  }

  function show(width) {
    const i = page.state.chosen;
    holder.hidden = i === null;
    if (i === null) return;
    const isOpen = holder.querySelector("details[open]") !== null;
    holder.replaceChildren(...parts(i, width || holder.clientWidth));
    if (isOpen && holder.querySelector("details")) holder.querySelector("details").open = true;
  }
  page.watchers.push((what) => { if ("chosen" in what || "weights" in what) show("weights" in what ? last.width : 0); });
  let wide = 0;
  window.addEventListener("resize", () => { if (holder.clientWidth !== wide) { wide = holder.clientWidth; show(); } });
  return { show, parts, strips };
})();
