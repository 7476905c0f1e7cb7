// Tables sort by a click or a key press on a head: numbers as numbers, words as words, once more turns the order.
for (const table of document.querySelectorAll("table")) {
  const heads = [...table.querySelectorAll("thead th")];
  heads.forEach((head, column) => {
    const button = head.querySelector("button");
    if (!button) return;
    button.addEventListener("click", () => {
      const down = head.getAttribute("aria-sort") === "ascending";
      heads.forEach((one) => one.removeAttribute("aria-sort"));
      head.setAttribute("aria-sort", down ? "descending" : "ascending");
      const value = (row) => {
        const text = row.cells[column].textContent.trim();
        const number = text.startsWith("unlimited") ? Infinity : parseFloat(text.replace(/^over /, ""));
        return Number.isNaN(number) ? text : number;
      };
      const before = (a, b) => {
        const [x, y] = [value(a), value(b)];
        if (typeof x === "number" && typeof y === "number") return x === y ? 0 : x < y ? -1 : 1;
        return String(x).localeCompare(String(y));
      };
      const rows = [...table.tBodies[0].rows].sort(before);
      table.tBodies[0].append(...(down ? rows.reverse() : rows));
    });
  });
}
