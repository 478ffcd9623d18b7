// Paper: what is printed, and how large, settled before the browser lays out its pages.
const paper = (() => {
  const { make, state } = page;
  const A4_WIDE_PX = 688, A4_TALL_PX = 990; // inside the margins, with some to spare for what paper lays out differently
  const SIZES = [1, 0.95, 0.9, 0.85, 0.8, 0.75, 0.7, 0.65, 0.6, 0.55, 0.5];
  const PAPERS = {
    a4: { rule: "@page { size: A4; margin: 14mm; }", words: "A4 pages" },
    a3: { rule: "@page { size: A3 landscape; margin: 12mm; }", words: "one A3 sheet" },
    leaves: { rule: "@page { size: A4; margin: 14mm; }", words: "a leaf for each of the shortlist" },
  };
  // an @page rule in a style element would break the page's own policy
  const sheet = new CSSStyleSheet();
  const leaves = make("div", { id: "leaves" });
  const holder = document.getElementById("leaf"), aside = document.querySelector("main > .aside");
  let chosen = "a4", after = null;

  function choose(name) {
    chosen = name;
    sheet.replaceSync(PAPERS[name].rule);
  }
  // a leaf is one page: what is longer is set smaller, over the whole width
  function fit(holder, i) {
    for (const size of SIZES) {
      const wide = Math.floor(A4_WIDE_PX / size);
      holder.style.zoom = "";
      holder.style.width = `${wide}px`;
      holder.replaceChildren(...leaf.parts(i, wide).filter((part) => part));
      if (holder.getBoundingClientRect().height * size > A4_TALL_PX && size > SIZES[SIZES.length - 1]) continue;
      holder.style.zoom = String(size);
      return;
    }
  }

  function before() {
    const map = window.map_plan, view = [map.getCenter(), map.getZoom()];
    document.body.classList.add("on-paper", `on-${chosen}`);
    plan.print(true);
    ladder.show(false);
    if (chosen === "a4") holder.before(aside);
    if (chosen === "a4" && state.chosen !== null) fit(holder, state.chosen);
    if (chosen === "leaves") {
      for (const i of ladder.shown()) {
        const one = make("section", { class: "leaf" });
        leaves.append(one);
        fit(one, i);
      }
    }
    after = () => {
      document.body.classList.remove("on-paper", `on-${chosen}`);
      leaves.replaceChildren();
      holder.style.zoom = holder.style.width = "";
      holder.after(aside); // as it stood
      plan.print(false);
      map.setView(view[0], view[1], { animate: false });
      ladder.show(false);
      leaf.show();
      choose("a4");
    };
  }

  function start() {
    document.adoptedStyleSheets = [...document.adoptedStyleSheets, sheet];
    choose("a4");
    document.querySelector("main").append(leaves);
    document.getElementById("papers").append("Print: ", ...Object.entries(PAPERS).flatMap(([name, one], k) => [k ? " · " : "",
      make("button", { type: "button", "data-paper": name, onclick: () => { choose(name); window.print(); } }, one.words)]));
    window.addEventListener("beforeprint", before);
    window.addEventListener("afterprint", () => { if (after) after(); after = null; });
  }
  return { start, choose, state };
})();
