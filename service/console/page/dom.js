// Making and changing elements. Every string becomes text: there is no way from
// here to markup.

const svgSpace = "http://www.w3.org/2000/svg";

export const byID = (id) => document.getElementById(id);

function dress(el, props, kids) {
  for (const [name, value] of Object.entries(props ?? {})) {
    if (value === null || value === undefined || value === false) continue;
    if (name === "on") {
      for (const [event, does] of Object.entries(value)) el.addEventListener(event, does);
    } else {
      el.setAttribute(name, value === true ? "" : String(value));
    }
  }
  el.append(...kids.filter((k) => k !== null && k !== undefined && k !== ""));
  return el;
}

// h makes an element of the page; its children are elements and texts.
export const h = (tag, props, ...kids) => dress(document.createElement(tag), props, kids);

// svg makes an element of a picture.
export const svg = (tag, props, ...kids) => dress(document.createElementNS(svgSpace, tag), props, kids);

// put sets an element's text if it differs, so that nothing is drawn or read
// aloud anew for nothing.
export function put(el, text) {
  if (el.textContent !== text) el.textContent = text;
}

export function show(el, shown) {
  if (el.hidden === shown) el.hidden = !shown;
}

const rowsOf = new WeakMap();

// rows keeps one element for each item by its key, so that focus stays where it
// is while what is around it changes. make returns {el, update(item)}: what
// changes reaches a row by update alone. none is said where there is no item.
export function rows(into, items, keyOf, make, none) {
  let known = rowsOf.get(into);
  if (!known) rowsOf.set(into, known = new Map());
  const seen = new Set();
  let before = null;
  for (const item of items) {
    const key = keyOf(item);
    if (seen.has(key)) continue;
    seen.add(key);
    let row = known.get(key);
    if (!row) known.set(key, row = make(item));
    row.update?.(item);
    const place = before ? before.nextSibling : into.firstChild;
    if (place !== row.el) into.insertBefore(row.el, place);
    before = row.el;
  }
  for (const [key, row] of known) {
    if (!seen.has(key)) {
      row.el.remove();
      known.delete(key);
    }
  }
  if (!none) return;
  known.empty ??= into.tagName === "TBODY" ? h("tr", { class: "none" }, h("td", { colspan: 6 }, none)) : h("li", { class: "none" }, none);
  if (seen.size > 0) known.empty.remove(); else if (!known.empty.isConnected) into.append(known.empty);
}
