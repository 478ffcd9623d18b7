// The ranked table with sort and find, and the shelf of plots set aside.
const ranking = (() => {
  const { data, plots, make, ruler, state } = page;
  const PAGE_ROWS = window.matchMedia("(max-width: 620px)").matches ? 12 : 100;
  const heads = document.getElementById("heads"), rows = document.getElementById("rows");
  const more = document.getElementById("more"), found = document.getElementById("found"), find = document.getElementById("find");
  const everything = document.getElementById("all-readings");
  let sorted = { key: "rank", down: false }, shown = PAGE_ROWS, wide = false;

  const first = (lines) => (lines && lines.length ? lines[0] : "");
  const reason = (i, kind) => (data.reasons[i] ? first(data.reasons[i][kind]) : "");
  let searchable = null; // made when somebody first looks for something
  const searched = () => plots.plot.map((plot, i) =>
    [plot, plots.name[i], page.zoneTitle(i), reason(i, "for"), reason(i, "against")].join(" ").toLowerCase());

  function columns() {
    const out = [
      { key: "rank", head: "rank", kind: "rank", value: (i) => page.now.rank[i], cell: rankCell },
      { key: "plot", head: "plot", kind: "plot", value: (i) => plots.name[i] || plots.plot[i], cell: plotCell },
      { key: "zone", head: "zone", kind: "zone", value: (i) => page.zoneTitle(i), cell: (i) => page.zoneTitle(i) },
      { key: "overall", head: "overall mark", kind: "mark", best: true, value: (i) => page.now.mark[i], cell: markCell },
    ];
    const one = page.question();
    if (one) out.push({ key: "asked", head: one.column.toLowerCase(), kind: "asked mark", best: true, value: (i) => one.marks[i], cell: (i) => askedCell(one, i) });
    out.push(
      { key: "for", head: "best reason", kind: "why", value: (i) => reason(i, "for"), cell: (i) => reason(i, "for") },
      { key: "against", head: "worst reason", kind: "why against", value: (i) => reason(i, "against"), cell: (i) => reason(i, "against") });
    if (wide) {
      for (const reading of data.readings) {
        out.push({ key: reading.name, head: reading.title, unit: reading.name === "breeze_arrival_h" ? "" : reading.unit === "0–1" ? "%" : reading.unit, says: reading.says, kind: "number",
          value: (i) => reading.values[i], cell: (i) => (reading.values[i] === null || page.readingWords(reading, i) === null ? "" : page.shown({ ...reading, unit: reading.unit === "0–1" ? "0–1" : "" }, reading.values[i])) });
      }
    }
    return out;
  }

  function rankCell(i) {
    const rank = page.now.rank[i] === null ? "–" : String(page.now.rank[i]);
    return plots.alike[i] ? [rank, " ", make("small", { class: "sure" }, `alike: ${plots.alike[i]}`)] : rank;
  }
  function plotCell(i) {
    const name = plots.name[i] === null ? `Plot ${plots.plot[i]}` : plots.name[i];
    const button = make("button", { type: "button", onclick: () => page.change({ chosen: i }) }, name);
    return plots.name[i] === null ? [button] : [button, " ", make("small", {}, `plot ${plots.plot[i]}`)];
  }
  function markCell(i) {
    return [page.markWords(i), ruler(page.now.mark[i], page.now.low[i], page.now.high[i], 86, 14)];
  }
  function askedCell(one, i) {
    if (!page.asks(i)) return make("small", {}, "not asked");
    return one.marks[i] === null ? "unknown" : [one.marks[i].toFixed(0), ruler(one.marks[i], null, null, 86, 14)];
  }

  // the ranking is in order already; plots without a rank stand at its end
  function byRank(isDown) {
    const { order, rank } = page.now, rest = order.length < page.ranked.length ? page.ranked.filter((i) => rank[i] === null) : [];
    return isDown ? [...rest.reverse(), ...[...order].reverse()] : [...order, ...rest];
  }
  function compare(column) {
    const turn = sorted.down ? -1 : 1, place = new Map(page.now.order.map((i, k) => [i, k]));
    const order = (a, b) => (place.get(a) ?? Infinity) - (place.get(b) ?? Infinity) || a - b;
    return (a, b) => {
      const x = column.value(a), y = column.value(b);
      if (x === null || y === null) return (x === null) - (y === null) || order(a, b);
      const by = typeof x === "number" ? x - y : String(x).localeCompare(String(y), "en", { numeric: true });
      return turn * by || order(a, b);
    };
  }

  function show() {
    const all = columns();
    if (!all.some((column) => column.key === sorted.key)) sorted = { key: "rank", down: false };
    const by = all.find((column) => column.key === sorted.key);
    const wanted = find.value.trim().toLowerCase();
    if (wanted && !searchable) searchable = searched();
    const inOrder = by.key === "rank" ? byRank(sorted.down) : [...page.ranked].sort(compare(by));
    const fits = wanted ? inOrder.filter((i) => searchable[i].includes(wanted)) : inOrder;
    heads.replaceChildren(...all.map((column) => {
      const sort = () => {
        sorted = { key: column.key, down: sorted.key === column.key ? !sorted.down : Boolean(column.best) };
        show();
        heads.querySelector(`th[data-key="${column.key}"] button`).focus();
      };
      const order = column.key !== sorted.key ? "none" : sorted.down ? "descending" : "ascending";
      return make("th", { scope: "col", class: column.kind, "aria-sort": order, "data-key": column.key, title: column.says },
        make("button", { type: "button", onclick: sort }, column.head), column.unit ? make("small", {}, column.unit) : null);
    }));
    rows.replaceChildren(...fits.slice(0, shown).map((i) => {
      const row = make("tr", { class: i === state.chosen ? "chosen" : null, "data-plot": i },
        ...all.map((column) => make("td", { class: column.kind, "data-head": column.head }, ...[column.cell(i)].flat())));
      row.addEventListener("click", () => page.change({ chosen: i }));
      return row;
    }));
    more.hidden = fits.length <= shown;
    more.textContent = `show ${Math.min(PAGE_ROWS, fits.length - shown)} more of ${fits.length}`;
    found.hidden = !wanted;
    found.textContent = `${fits.length} of ${page.ranked.length} ranked plots`;
  }

  function mark() {
    for (const row of rows.children) row.classList.toggle("chosen", Number(row.dataset.plot) === state.chosen);
  }

  function shelf() {
    // the leaf lies above, maybe out of sight, so that a choice here has to bring it into view
    const open = (i) => {
      page.change({ chosen: i });
      const leaf = document.getElementById("leaf"), top = leaf.getBoundingClientRect().top;
      if (top < 0 || top > window.innerHeight - 160) leaf.scrollIntoView({ block: "start" });
    };
    document.getElementById("shelf").replaceChildren(...page.aside.map((i) => make("li", { onclick: () => open(i) }, page.sign("aside"),
      make("button", { type: "button" }, page.called(i)),
      make("span", {}, plots.set_aside[i] || ""))));
    if (!page.aside.length) document.getElementById("aside-lead").textContent = "No plot is set aside.";
  }

  // the table as it stands, every row of it; what looks like a formula stays text in a spreadsheet
  function csv() {
    const all = columns(), quoted = (text) => `"${(/^[=+\-@\t\n]/.test(text) ? `'${text}` : text).replace(/"/g, '""')}"`;
    const field = (value) => (value === null || value === undefined ? "" : typeof value === "number" ? String(value) : quoted(value));
    const lines = page.now.order.map((i) => [plots.plot[i], ...all.map((column) => column.value(i))].map(field).join(","));
    const weighed = weigh.changed().map((one) => `${words.noun(one)} ${weigh.STOPS[weigh.stops[one.name]].counting}`);
    const head = ["plot id", ...all.map((column) => (column.unit ? `${column.head} [${column.unit}]` : column.head))];
    return [head.map(quoted).join(","), ...lines, ...(weighed.length ? [quoted(`weighed with ${weighed.join(", ")}`)] : [])].join("\n") + "\n";
  }
  function download() {
    const address = URL.createObjectURL(new Blob(["\ufeff", csv()], { type: "text/csv" }));
    make("a", { href: address, download: "ranking as shown.csv" }).click();
    setTimeout(() => URL.revokeObjectURL(address), 1000);
  }

  function start() {
    document.getElementById("download").addEventListener("click", download);
    document.getElementById("table-holder").hidden = false;
    document.getElementById("ranking-tools").hidden = false;
    find.addEventListener("input", () => { shown = PAGE_ROWS; show(); });
    more.addEventListener("click", () => { shown += PAGE_ROWS; show(); });
    everything.addEventListener("click", () => {
      wide = !wide;
      everything.setAttribute("aria-pressed", String(wide));
      show();
    });
    page.watchers.push((what) => { if ("question" in what || "weights" in what) show(); else if ("chosen" in what) mark(); });
    shelf();
    show();
  }
  return { start, csv };
})();
