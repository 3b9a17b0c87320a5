"use strict";
// Everything from a file is put in place as text, never as markup.
(() => {
  const LEVELS = ["error", "warning", "note"];
  const MARKS = { error: "◆", warning: "▲", note: "●" };
  const UNDRAWN = "Only the worst findings of so many have drawings; audit this file alone for more.";
  const STEP = 60; // findings shown at a time
  const { files, findings } = JSON.parse(document.getElementById("data").textContent);
  const at = (id) => document.getElementById(id);
  const list = at("list");
  const more = at("more");
  const chosen = { text: at("text"), rule: at("rule"), element: at("element"), file: at("file") };
  const order = at("order");
  const toggles = [...document.querySelectorAll("[data-level]")];
  let found = [];
  let shown = 0;
  let group = null; // the file whose section is being filled

  function make(tag, attributes, ...children) {
    const node = document.createElement(tag);
    for (const [name, value] of Object.entries(attributes || {})) node.setAttribute(name, value);
    node.append(...children.filter((child) => child !== null && child !== undefined));
    return node;
  }

  // ---- what is looked for

  const heaps = new Map();
  function heap(finding) {
    let words = heaps.get(finding);
    if (words === undefined) {
      const { rule, element, shell, message, remedy } = finding;
      const all = [rule, element, shell, message, remedy, files[finding.file].path];
      words = all.concat(finding.witnesses || []).join(" ").toLowerCase();
      heaps.set(finding, words);
    }
    return words;
  }

  function fits() {
    const levels = new Set(toggles.filter(pressed).map((toggle) => toggle.dataset.level));
    const words = chosen.text.value.toLowerCase().split(/\s+/).filter(Boolean);
    const { rule, element } = chosen;
    const path = chosen.file.value.toLowerCase();
    const inside = files.map((file) => file.path.toLowerCase().includes(path));
    return (finding) =>
      levels.has(finding.severity) &&
      (!rule.value || finding.rule === rule.value) &&
      (!element.value || finding.element === element.value) &&
      inside[finding.file] &&
      words.every((word) => heap(finding).includes(word));
  }

  const pressed = (button) => button.getAttribute("aria-pressed") === "true";

  function refresh() {
    found = findings.filter(fits());
    if (order.value === "level") {
      found.sort((a, b) => LEVELS.indexOf(a.severity) - LEVELS.indexOf(b.severity));
    }
    list.replaceChildren();
    shown = 0;
    group = null;
    show(STEP);
    const many = new Set(found.map((finding) => finding.file)).size;
    at("status").textContent =
      `${found.length} of ${findings.length} findings, in ${many} file${many === 1 ? "" : "s"}`;
    for (const cell of document.querySelectorAll(".map [data-element]")) {
      cell.setAttribute("aria-pressed", String(cell.dataset.element === chosen.element.value));
    }
    remember();
  }

  // ---- how it is shown

  function show(count) {
    const last = Math.min(found.length, shown + count);
    for (; shown < last; shown += 1) {
      const finding = found[shown];
      if (group === null || group.file !== finding.file) {
        group = { file: finding.file, node: heading(files[finding.file]) };
        list.append(group.node);
      }
      group.node.append(entry(finding));
    }
    more.hidden = shown >= found.length;
    more.textContent = `Show ${Math.min(STEP, found.length - shown)} more`;
    if (!found.length) list.append(make("p", { class: "soft" }, "Nothing fits this choice."));
  }

  function heading(file) {
    const facts = [file.layout ? `layout ${file.layout}` : "no layout"];
    if (file.label) facts.push(`label ${file.label}`);
    const title = make("h3", {}, file.path);
    return make("section", { class: "file" }, title, make("p", { class: "soft" }, facts.join("; ")));
  }

  const where = (finding) => [finding.element, finding.shell].filter(Boolean).join(" ");

  function entry(finding) {
    const mark = make("span", { "aria-hidden": "true" }, MARKS[finding.severity]);
    const summary = make(
      "summary",
      {},
      make("span", { class: `badge ${finding.severity}` }, mark, ` ${finding.severity}`),
      make("span", { class: "where" }, where(finding)),
      make("span", { class: "message" }, finding.message),
      make("span", { class: "place" }, `${finding.rule}  line ${finding.line}:${finding.column}`),
    );
    const node = make("details", { class: `finding ${finding.severity}` }, summary);
    // What is inside is made when it is first opened.
    node.addEventListener("toggle", () => node.open && fill(node, finding));
    return node;
  }

  function fill(node, finding) {
    if (node.children.length > 1) return;
    const body = make("div", { class: "body" });
    if (finding.excerpt) body.append(excerpt(finding));
    const facts = make("dl", {});
    const fact = (name, ...values) => {
      facts.append(make("dt", {}, name), ...values.map((value) => make("dd", {}, value)));
    };
    for (const name of ["measured", "limit", "expected"]) {
      if (name in finding) fact(name, finding[name]);
    }
    if (finding.witnesses) fact("because", ...finding.witnesses);
    if (finding.remedy) fact("to do", finding.remedy);
    const place = where(finding) || "this file";
    const words = `overlapse: accept ${finding.rule} for ${place} because REASON`;
    fact("to accept", make("span", {}, make("code", {}, words), " in a comment of the file"));
    const about = make("a", { href: `#rule-${finding.rule}` }, "what this rule looks for, and why");
    about.addEventListener("click", () => {
      at(`rule-${finding.rule}`).open = true;
    });
    fact("rule", about);
    body.append(facts);
    const scene = finding.scene && at(finding.scene);
    if (scene) body.append(make("div", { class: "drawings" }, scene.content.cloneNode(true)));
    else if (finding.scene) body.append(make("p", { class: "soft" }, UNDRAWN));
    node.append(body);
  }

  function excerpt(finding) {
    const { first, lines, mark } = finding.excerpt;
    const [row, start, end] = mark;
    const block = make("pre", { tabindex: "0", "aria-label": `lines around ${finding.line}` });
    const width = String(first + lines.length - 1).length;
    lines.forEach((line, k) => {
      const number = make("span", { class: "line" }, String(first + k).padStart(width) + "  ");
      if (k === row) {
        const pointed = make("mark", { class: finding.severity }, line.slice(start, end) || " ");
        const parts = [line.slice(0, start), pointed, line.slice(end)];
        block.append(make("span", { class: "at" }, number, ...parts), "\n");
      } else {
        block.append(number, line, "\n");
      }
    });
    return block;
  }

  function row(file) {
    const link = make("button", { type: "button", class: "link", "data-file": file.path }, file.path);
    const cells = file.levels.map((count) =>
      make("td", { class: count ? "number" : "number none" }, String(count || "·")),
    );
    const name = make("th", { scope: "row" }, link);
    if (file.problem) name.append(" ", make("span", { class: "problem" }, file.problem));
    return make(
      "tr",
      {},
      name,
      ...cells,
      make("td", { class: "extra" }, file.layout || "none"),
      make("td", { class: "extra" }, file.label),
      make("td", { class: "number extra" }, String(file.elements)),
    );
  }

  // ---- the choice is kept in the address, so that it can be passed on

  function remember() {
    const kept = new URLSearchParams();
    for (const [name, field] of Object.entries(chosen)) if (field.value) kept.set(name, field.value);
    const off = toggles.filter((toggle) => !pressed(toggle)).map((toggle) => toggle.dataset.level);
    if (off.length) kept.set("without", off.join(" "));
    if (order.value !== "file") kept.set("order", order.value);
    const hash = String(kept) ? `#?${kept}` : location.hash.startsWith("#?") ? "#" : location.hash;
    if (hash !== location.hash) history.replaceState(null, "", hash);
  }

  function recall() {
    if (!location.hash.startsWith("#?")) return;
    const kept = new URLSearchParams(location.hash.slice(2));
    for (const [name, field] of Object.entries(chosen)) field.value = kept.get(name) || "";
    const off = (kept.get("without") || "").split(" ");
    for (const toggle of toggles) {
      toggle.setAttribute("aria-pressed", String(!off.includes(toggle.dataset.level)));
    }
    order.value = kept.get("order") === "level" ? "level" : "file";
  }

  // ---- what people do

  let waiting = 0;
  function soon() {
    clearTimeout(waiting);
    waiting = setTimeout(refresh, 80);
  }

  function pick(field, value) {
    field.value = field.value === value ? "" : value;
    refresh();
    at("findings").scrollIntoView();
    at("findings").focus({ preventScroll: true });
  }

  chosen.text.addEventListener("input", soon);
  chosen.file.addEventListener("input", soon);
  for (const field of [chosen.rule, chosen.element, order]) field.addEventListener("change", refresh);
  at("filter").addEventListener("submit", (event) => event.preventDefault());
  at("filter").addEventListener("reset", () => {
    for (const toggle of toggles) toggle.setAttribute("aria-pressed", "true");
    setTimeout(refresh);
  });
  more.addEventListener("click", () => {
    const next = shown;
    show(STEP);
    const opened = list.querySelectorAll("summary")[next];
    if (opened) opened.focus();
  });
  window.addEventListener("hashchange", () => {
    recall();
    if (location.hash.startsWith("#?")) refresh();
  });
  document.addEventListener("click", (event) => {
    const button = event.target.closest("button");
    if (!button) return;
    const { element, rule, file, level } = button.dataset;
    if (element) pick(chosen.element, element);
    if (rule) pick(chosen.rule, rule);
    if (file) pick(chosen.file, file);
    if (level) {
      button.setAttribute("aria-pressed", String(!pressed(button)));
      refresh();
    }
    if (button.id === "more-files") {
      document.querySelector("#files tbody").replaceChildren(...files.map(row));
      button.remove();
    }
  });
  document.addEventListener("keydown", (event) => {
    if (event.ctrlKey || event.metaKey || event.altKey) return;
    const typing = event.target.matches("input, select, textarea");
    if (event.key === "/" && !typing) {
      event.preventDefault();
      chosen.text.focus();
    } else if (event.key === "Escape" && event.target === chosen.text) {
      chosen.text.value = "";
      refresh();
    } else if (event.key === "ArrowDown" || event.key === "ArrowUp") {
      const all = [...list.querySelectorAll("summary")];
      const here = all.indexOf(event.target);
      const fromSearch = event.target === chosen.text && event.key === "ArrowDown";
      if (here < 0 && !fromSearch) return;
      const next = all[fromSearch ? 0 : here + (event.key === "ArrowDown" ? 1 : -1)];
      event.preventDefault();
      (next || (here <= 0 ? chosen.text : more.hidden ? all[here] : more)).focus();
    }
  });
  // On paper there is no button to press: everything that fits the choice is printed.
  window.addEventListener("beforeprint", () => show(Math.min(found.length, 2000)));

  recall();
  refresh();
})();
