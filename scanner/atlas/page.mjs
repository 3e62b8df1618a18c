// The page's own part of the work: the address and the link, pictures, arrow keys, word of a lost connection.

const WORDS = {
  family: "Plot of the family: the arrow keys move the selected table",
  portrait: "Phase portrait: the arrow keys move the start of the traced orbit",
  outline: "Outline of the table with the chords of the traced orbit",
}
const STEPS = {ArrowLeft: [-1, 0], ArrowRight: [1, 0], ArrowUp: [0, 1], ArrowDown: [0, -1]}

export default ({wire, plots}, document_) => {
  show_link(wire)
  wire.properties.query.change.connect(() => show_link(wire))
  document.getElementById("copy").addEventListener("click", copy_link)
  for (const [name, model] of Object.entries(plots)) {
    listen_to_arrows(name, Bokeh.index.find_one(model).el, wire)
  }
  for (const button of document.querySelectorAll("[data-picture]")) {
    button.addEventListener("click", () => save_picture(plots[button.dataset.picture], button.dataset))
  }
  document_.on_event("connection_lost", () => { document.getElementById("lost").hidden = false })
}

function show_link({query}) {
  const address = `${location.origin}${location.pathname}?${query}`
  history.replaceState(null, "", address)
  document.getElementById("link").value = address
  for (const link of document.querySelectorAll("[data-file]")) {
    link.href = `${link.dataset.file}?${query}`
  }
}

async function copy_link() {
  const field = document.getElementById("link")
  field.select()
  await navigator.clipboard.writeText(field.value)
  const button = document.getElementById("copy")
  button.textContent = "Copied"
  setTimeout(() => { button.textContent = "Copy" }, 1500)
}

// Plots are reached by the tab key by themselves; what they do not handle comes up to their place.
function listen_to_arrows(name, element, wire) {
  element.setAttribute("role", "group")
  element.setAttribute("aria-label", WORDS[name])
  if (name == "outline") {
    return
  }
  element.addEventListener("keydown", (event) => {
    if (event.key in STEPS && !event.ctrlKey && !event.altKey && !event.metaKey) {
      event.preventDefault()
      wire.press = [wire.press[0] + 1, name == "family" ? 0 : 1, ...STEPS[event.key]]
    }
  })
}

async function save_picture(place, {picture, format}) {
  const [plot] = place.children
  const blob = await Bokeh.index.find_one(plot).export(format).to_blob()
  const link = document.createElement("a")
  link.href = URL.createObjectURL(blob)
  link.download = `${picture}.${format}`
  link.click()
  URL.revokeObjectURL(link.href)
}
