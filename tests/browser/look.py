"""What a page must be on a phone, measured in the browser: each function returns what is wrong, as a list."""

from axe_playwright_python.sync_playwright import Axe

AXE = Axe()
TAGS = ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa"]
# 7:1 for letters of every size; the ordinary rule's 4.5:1 is within it, and each of the two takes a second a page.
CONTRAST = ["color-contrast-enhanced"]
SEVEN_TO_ONE = """() => axe.configure({ checks: [{ id: "color-contrast-enhanced", options: {
  ignoreUnicode: true, ignoreLength: false, ignorePseudo: false, boldValue: 700, boldTextPt: 14, largeTextPt: 18,
  contrastRatio: { normal: { expected: 7 }, large: { expected: 7 } },
  pseudoSizeThreshold: 0.25, shadowOutlineEmMax: 0.1,
} }] })"""
RULES = {
    "runOnly": {"type": "tag", "values": TAGS},
    "rules": {"color-contrast": {"enabled": False}, "color-contrast-enhanced": {"enabled": True}},
}

WIDER = """width => {
  const room = document.documentElement.scrollWidth;
  if (room <= width) return [];
  const beyond = [...document.body.querySelectorAll("*")].filter(
    (one) => one.getBoundingClientRect().right > width + 0.5 && !one.closest(".scroll:not(.cards-on-phone), .skip"));
  return [`the page is ${room} px wide`, ...beyond.slice(0, 5).map((one) => one.outerHTML.slice(0, 90))];
}"""

CROWDED = """() => {
  const shown = (one) => one.checkVisibility() && !one.matches(".unseen, .menu *, :disabled");
  const buttons = [...document.querySelectorAll("button, .button")].filter(shown)
    .map((one) => ({ name: one.innerText.trim(), low: one.matches(".small"), at: one.getBoundingClientRect() }));
  const wrong = [];
  for (const one of buttons) {
    if (one.at.height < (one.low ? 48 : 56)) wrong.push(`${one.name} is ${one.at.height} px high`);
    for (const other of buttons) {
      if (other === one) continue;
      const across = Math.max(one.at.left - other.at.right, other.at.left - one.at.right);
      const down = Math.max(one.at.top - other.at.bottom, other.at.top - one.at.bottom);
      if (Math.max(across, down) < 7.9) wrong.push(`${one.name} is ${Math.max(across, down)} px from ${other.name}`);
    }
  }
  return wrong;
}"""

SMALL = """() => {
  const size = (one) => parseFloat(getComputedStyle(one).fontSize);
  const wrong = [];
  const fields = "input:not([type=hidden], [type=checkbox]), select, textarea:not(.cells)";
  for (const one of document.querySelectorAll(fields)) {
    if (one.checkVisibility() && size(one) < 20) wrong.push(`${one.id} is written in ${size(one)} px`);
  }
  for (const one of document.querySelectorAll(".oxygen-now")) {
    if (size(one) < 40) wrong.push(`the oxygen number is ${size(one)} px`);
  }
  if (size(document.body) < 18) wrong.push(`the text is ${size(document.body)} px`);
  return wrong;
}"""


def unfold(page):
    """Open every fold, so that what is in it is looked at too."""
    page.evaluate("document.querySelectorAll('main details').forEach((one) => { one.open = true; })")


def wider_than(page, width, text_percent=100):
    """Return what is wider than a screen of that width, with text enlarged."""
    page.set_viewport_size({"width": width, "height": 740})
    page.evaluate("percent => { document.documentElement.style.fontSize = `${percent}%`; }", 1.125 * text_percent)
    return [f"at {width} px and {text_percent} % text: {one}" for one in page.evaluate(WIDER, width)]


def crowded(page):
    """Return main buttons lower than 56 px (small ones: 48 px) or nearer to another than 8 px."""
    return page.evaluate(CROWDED)


def too_small(page):
    """Return text and inputs too small for the bank of a river."""
    return page.evaluate(SMALL)


def barriers(page, options=RULES):
    """Return every serious or critical finding of axe, with where it is."""
    if not page.evaluate("'axe' in window"):
        page.evaluate(AXE.axe_script)
        page.evaluate(SEVEN_TO_ONE)
    found = page.evaluate("options => axe.run(options)", options | {"resultTypes": ["violations"]})["violations"]
    return [
        f"{one['id']}: {node['html'][:120]} {node['any'][0]['message'] if node['any'] else ''}"
        for one in found
        if one["impact"] in ("serious", "critical")
        for node in one["nodes"]
    ]


def barriers_in_the_dark(page):
    """Return what can't be read in the dark look."""
    page.evaluate("document.documentElement.dataset.look = 'dark'")
    found = barriers(page, {"runOnly": {"type": "rule", "values": CONTRAST}})
    return [f"in the dark look, {one}" for one in found]
