// What the page does by itself: tabs, the narrow screen's picture switch, the key K, and a word
// when the connection is lost.

// BokehJS writes the place of every glyph into a style element whenever it paints, mostly the
// same place as before; a style that is written is parsed anew, and the page's with it. Leaving
// unchanged ones alone halves the time of a frame.
const written = Object.getOwnPropertyDescriptor(Node.prototype, "textContent")
Object.defineProperty(HTMLStyleElement.prototype, "textContent", {
  configurable: true,
  get() { return written.get.call(this) },
  set(text) { if (text !== written.get.call(this)) written.set.call(this, text) },
})

const tabs = [...document.querySelectorAll("[role=tab]")]
// Python computes what the open page shows.
function tell(name) {
  const field = everywhere("input[data-do=page]")[0]
  if (!field) return
  field.value = name
  field.dispatchEvent(new Event("change", {bubbles: true}))
}
function open_page(tab) {
  for (const other of tabs) {
    const chosen = other === tab
    other.setAttribute("aria-selected", String(chosen))
    other.tabIndex = chosen ? 0 : -1
    document.getElementById(other.getAttribute("aria-controls")).hidden = !chosen
  }
  const name = tab.getAttribute("aria-controls")
  document.body.dataset.page = name
  tell(name)
  const hash = tab === tabs[0] ? "" : `#${tab.getAttribute("aria-controls")}`
  history.replaceState(null, "", location.pathname + location.search + hash)
  window.dispatchEvent(new Event("resize"))
}
for (const [i, tab] of tabs.entries()) {
  tab.addEventListener("click", () => open_page(tab))
  tab.addEventListener("keydown", (event) => {
    const step = {ArrowRight: 1, ArrowLeft: -1}[event.key]
    if (!step) return
    const next = tabs[(i + step + tabs.length) % tabs.length]
    open_page(next)
    next.focus()
  })
}
// The open page stands after the # of the address.
const named = () => tabs.find((tab) => `#${tab.getAttribute("aria-controls")}` === location.hash)
open_page(named() ?? tabs[0])
window.addEventListener("hashchange", () => open_page(named() ?? tabs[0]))

const planes = document.querySelector(".planes")
planes.dataset.plane = "tradeoff"
for (const button of document.querySelectorAll(".switch button")) {
  button.addEventListener("click", () => {
    planes.dataset.plane = button.dataset.plane
    for (const other of document.querySelectorAll(".switch button")) {
      other.setAttribute("aria-pressed", String(other === button))
    }
    window.dispatchEvent(new Event("resize"))
  })
}

function typing() {
  let active = document.activeElement
  while (active?.shadowRoot?.activeElement) active = active.shadowRoot.activeElement
  return active?.matches("input:not([type=range]):not([type=checkbox]):not([type=radio]), textarea, select")
}
function everywhere(selector, root = document) {
  const found = [...root.querySelectorAll(selector)]
  for (const element of root.querySelectorAll("*")) {
    if (element.shadowRoot) found.push(...everywhere(selector, element.shadowRoot))
  }
  return found
}
document.addEventListener("keydown", (event) => {
  if (event.ctrlKey || event.metaKey || event.altKey || typing()) return
  if (event.key === "k" || event.key === "K") everywhere("button[data-do=keep]")[0]?.click()
})

const lost = document.querySelector(".lost")
lost.querySelector("button").addEventListener("click", () => location.reload())

const watching = setInterval(() => {
  const doc = window.Bokeh?.documents?.[0]
  if (!doc) return
  clearInterval(watching)
  const telling = setInterval(() => {
    if (!everywhere("input[data-do=page]").length) return
    clearInterval(telling)
    tell(document.body.dataset.page)
  }, 50)
  doc.on_event("connection_lost", () => { lost.hidden = false })
  doc.on_event("client_reconnected", () => { lost.hidden = true })
}, 100)
