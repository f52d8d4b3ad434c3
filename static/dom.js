// Making and changing nodes. Text always goes in as text, never as markup.

const SVG = "http://www.w3.org/2000/svg";

function dress(node, attributes, children) {
  for (const [name, value] of Object.entries(attributes)) {
    if (value !== null && value !== undefined && value !== false) node.setAttribute(name, value === true ? "" : value);
  }
  node.append(...children);
  return node;
}

export const el = (name, attributes = {}, ...children) => dress(document.createElement(name), attributes, children);

export const svg = (name, attributes = {}, ...children) => dress(document.createElementNS(SVG, name), attributes, children);

export const byId = (id) => document.getElementById(id);

/** Sets the text only where it changed, so that a scrub touches as little of the page as it can. */
export function setText(node, text) {
  if (node.textContent !== text) node.textContent = text;
}

/** Sets attributes of an existing node; null takes one away. */
export function set(node, attributes) {
  for (const [name, value] of Object.entries(attributes)) {
    if (value === null) node.removeAttribute(name);
    else node.setAttribute(name, value);
  }
  return node;
}
