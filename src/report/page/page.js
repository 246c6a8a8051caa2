(() => {
  "use strict";
  // Sorts, filters and copies tables. The page is whole without this.
  const number = (text) => {
    const plain = text.replace(/[\u202f\u00a0 ]/g, "").replace(/\u2212/g, "-");
    const found = plain.match(/-?\d[\d.]*(e[-+]?\d+)?/i);
    return found ? parseFloat(found[0]) : NaN;
  };
  const element = (name, words) => {
    const made = document.createElement(name);
    if (words) made.textContent = words;
    return made;
  };
  const sort = (body, column, numeric, down) => {
    const keyed = [...body.rows].map((row) => {
      const text = row.cells[column].textContent;
      return { row, text, value: numeric ? number(text) : NaN };
    });
    keyed.sort((a, b) => {
      if (numeric) {
        // What is no number stands last, whichever way.
        if (isNaN(a.value) || isNaN(b.value)) return isNaN(a.value) - isNaN(b.value);
        return down ? b.value - a.value : a.value - b.value;
      }
      const order = a.text.localeCompare(b.text, "en", { numeric: true });
      return down ? -order : order;
    });
    body.append(...keyed.map((k) => k.row));
  };
  const copy = async (table, told) => {
    const cell = (c) => c.textContent.replace(/[\t\n]/g, " ").trim();
    const rows = [...table.rows].filter((row) => !row.hidden);
    const text = rows.map((row) => [...row.cells].map(cell).join("\t")).join("\n");
    try {
      await navigator.clipboard.writeText(text);
      told.textContent = "Copied.";
    } catch {
      getSelection().selectAllChildren(table);
      told.textContent = "Selected: copy with the keys of your system.";
    }
  };
  for (const table of document.querySelectorAll("table")) {
    const body = table.tBodies[0];
    const rows = [...body.rows];
    if (rows.length > 1) {
      const heads = [...table.tHead.rows[0].cells];
      heads.forEach((head, column) => {
        const texts = rows.map((row) => row.cells[column].textContent);
        const numeric = head.classList.contains("n") ||
          texts.every((t) => t === "" || /^[-\u2212]?\d/.test(t) || /^(no|unknown)/.test(t));
        const button = element("button", head.textContent);
        button.type = "button";
        head.replaceChildren(button);
        button.addEventListener("click", () => {
          const down = head.getAttribute("aria-sort") === "ascending";
          heads.forEach((other) => other.removeAttribute("aria-sort"));
          head.setAttribute("aria-sort", down ? "descending" : "ascending");
          sort(body, column, numeric, down);
        });
      });
    }
    const tools = element("div");
    tools.className = "tools";
    const told = element("span");
    told.setAttribute("role", "status");
    if (rows.length > 12) {
      const label = element("label", "Rows with ");
      const input = element("input");
      input.type = "search";
      label.append(input);
      tools.append(label);
      const texts = rows.map((row) => row.textContent.toLowerCase());
      input.addEventListener("input", () => {
        const words = input.value.toLowerCase().split(/\s+/).filter(Boolean);
        let shown = 0;
        rows.forEach((row, i) => {
          row.hidden = !words.every((word) => texts[i].includes(word));
          shown += !row.hidden;
        });
        told.textContent = words.length ? `${shown} of ${rows.length} rows` : "";
      });
    }
    if (rows.length > 1) {
      const button = element("button", "Copy table");
      button.type = "button";
      button.addEventListener("click", () => copy(table, told));
      tools.append(button, told);
      table.parentElement.before(tools);
    }
  }
})();
