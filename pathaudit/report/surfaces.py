"""Two surfaces with the same few strokes: SVG text, and a bitmap for readers that show no SVG. White ground; sizes in CSS pixels."""

import io
from functools import cache
from html import escape

import numpy as np

INK, SOFT, QUIET, FAINT, LANE, TUBE, GROUND = "#1b1f24", "#5b6168", "#9a9fa4", "#dcdee0", "#f4f4f5", "#d2d4d6", "#ffffff"
LINE, GREEN, SEVERITY = "#0072b2", "#009e73", {"pass": "#009e73", "warn": "#b97f00", "fail": "#d55e00"}     # Okabe and Ito, the orange darker
WASH = "#b3d5e8"     # the line's colour, three tenths of it on the ground
STRIPES = {"warn": (8, (1,)), "fail": (5, (1, -1)), "gap": (8, (-1,))}       # spacing, directions of the stripes


class Svg:
    """Strokes gathered as SVG elements."""

    def __init__(self, width, height, title):
        self.width, self.height, self.title = width, height, title
        self._parts, self._patterns = [], {}

    def line(self, points, colour, width=1.0, dash=()):
        points = np.asarray(points, dtype=float)
        if len(points) < 2:
            return
        dashes = f' stroke-dasharray="{" ".join(map(str, dash))}"' if dash else ""
        self._parts.append(f'<path d="{_steps(points)}" stroke="{colour}" stroke-width="{width:g}"{dashes}/>')

    def area(self, points, kind, colour):
        self._parts.append(f'<path d="{_steps(np.asarray(points, dtype=float))}z" fill="url(#{self._pattern(kind, colour)})"/>')

    def wash(self, points):
        self._parts.append(f'<path d="{_steps(np.asarray(points, dtype=float))}z" fill="{WASH}"/>')

    def rect(self, x, y, w, h, fill="none", stroke="none", width=1.0, dash=()):
        dashes = f' stroke-dasharray="{" ".join(map(str, dash))}"' if dash else ""
        edge = f' stroke="{stroke}" stroke-width="{width:g}"{dashes}' if stroke != "none" else ""
        self._parts.append(f'<rect x="{x:.1f}" y="{y:.1f}" width="{w:.1f}" height="{h:.1f}" fill="{fill}"{edge}/>')

    def hatch(self, x, y, w, h, kind, colour, strength=1.0):
        self._parts.append(f'<rect x="{x:.1f}" y="{y:.1f}" width="{w:.1f}" height="{h:.1f}" fill="url(#{self._pattern(kind, colour)})" '
                           f'opacity="{strength:g}"/>')

    def circle(self, x, y, r, fill, stroke, width=1.5):
        self._parts.append(f'<circle cx="{x:.1f}" cy="{y:.1f}" r="{r:.1f}" fill="{fill}" stroke="{stroke}" stroke-width="{width:g}"/>')

    def text(self, x, y, words, colour=SOFT, align="left", size=11, bold=False):
        anchor = {"left": "", "right": ' text-anchor="end"', "centre": ' text-anchor="middle"'}[align]
        weight = ' font-weight="bold"' if bold else ""
        self._parts.append(f'<text x="{x:.1f}" y="{y + 0.36 * size:.1f}" fill="{colour}" stroke="none" font-size="{size}"{anchor}{weight}>{escape(words)}</text>')

    def text_width(self, words, size=11):
        return 0.53 * size * len(words)

    def _pattern(self, kind, colour):
        name = f"{kind}-{colour[1:]}"
        size, directions = STRIPES[kind]
        strokes = "".join(f'<path d="M{-1} {size + 1 if d > 0 else -1}L{size + 1} {-1 if d > 0 else size + 1}M{-size - 1} {size + 1 if d > 0 else -1}L1 '
                          f'{-size - 1 + size if d > 0 else size + 1}" stroke="{colour}" stroke-width="1.2"/>' for d in directions)
        self._patterns[name] = f'<pattern id="{name}" width="{size}" height="{size}" patternUnits="userSpaceOnUse">{strokes}</pattern>'
        return name

    def finish(self):
        return (f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {self.width:g} {self.height:g}" width="{self.width:g}" height="{self.height:g}" '
                f'style="max-width:100%;height:auto" role="img" fill="none" stroke-linejoin="round" stroke-linecap="round" font-family="Helvetica Neue, Arial, DejaVu Sans, sans-serif">'
                f'<title>{escape(self.title)}</title><defs>{"".join(self._patterns.values())}</defs>'
                f'<rect width="100%" height="100%" fill="{GROUND}"/>{"".join(self._parts)}</svg>')


def _steps(points):
    """Path data in tenths of a pixel: an absolute start and short relative steps."""
    tenths = np.rint(10 * points).astype(int)
    moves = np.diff(tenths, axis=0)
    moves = moves[np.any(moves != 0, axis=1)]
    start = f"M{tenths[0, 0] / 10:g} {tenths[0, 1] / 10:g}"
    return start + ("l" + " ".join(f"{dx / 10:g} {dy / 10:g}" for dx, dy in moves.tolist()) if len(moves) else "h.1")


class Bitmap:
    """The same strokes in Pillow, drawn large and reduced, so that edges are smooth."""

    LARGE, REDUCED = 3, 2       # drawn 3 times as large, kept at 1.5

    def __init__(self, width, height, title):
        from PIL import Image, ImageDraw

        self.width, self.height, self.title = width, height, title
        self._image = Image.new("RGB", (int(width * self.LARGE), int(height * self.LARGE)), GROUND)
        self._draw = ImageDraw.Draw(self._image)
        self._fonts = {}

    def line(self, points, colour, width=1.0, dash=()):
        large = self.LARGE * np.asarray(points, dtype=float)
        thick = max(1, round(width * self.LARGE))
        for piece in _dashed(large, [self.LARGE * d for d in dash]) if dash else [large]:
            if len(piece) > 1:
                self._draw.line([tuple(p) for p in piece.tolist()], fill=colour, width=thick, joint="curve")
        if thick > 6:
            for x, y in large[[0, -1]].tolist():
                self._draw.circle((x, y), thick / 2, fill=colour)

    def area(self, points, kind, colour):
        from PIL import Image, ImageDraw

        large = self.LARGE * np.asarray(points, dtype=float)
        low, high = np.floor(large.min(axis=0)).astype(int), np.ceil(large.max(axis=0)).astype(int) + 1
        mask = Image.new("1", tuple((high - low).tolist()))
        ImageDraw.Draw(mask).polygon([tuple(p) for p in (large - low).tolist()], fill=1)
        self._paste(low, high - low, kind, colour, 1.0, mask)

    def wash(self, points):
        self._draw.polygon([tuple(p) for p in (self.LARGE * np.asarray(points, dtype=float)).tolist()], fill=WASH)

    def rect(self, x, y, w, h, fill="none", stroke="none", width=1.0, dash=()):
        if fill != "none":
            self._draw.rectangle([self.LARGE * v for v in (x, y, x + w, y + h)], fill=fill)
        if stroke != "none":
            self.line([(x, y), (x + w, y), (x + w, y + h), (x, y + h), (x, y)], stroke, width, dash)

    def hatch(self, x, y, w, h, kind, colour, strength=1.0):
        low, size = np.rint(self.LARGE * np.array([[x, y], [w, h]])).astype(int)
        self._paste(low, np.maximum(size, 1), kind, colour, strength)

    def _paste(self, low, size, kind, colour, strength, within=None):
        from PIL import Image, ImageDraw, ImageChops

        spacing, directions = STRIPES[kind]
        width, height = size.tolist()
        mask = Image.new("L", (width, height))
        draw = ImageDraw.Draw(mask)
        for direction in directions:
            for start in range(-height, width + height, spacing * self.LARGE):
                ends = (start, height, start + height, 0) if direction > 0 else (start, 0, start + height, height)
                draw.line(ends, fill=round(255 * strength), width=self.LARGE)
        if within is not None:
            mask = ImageChops.multiply(mask, within.convert("L"))
        self._image.paste(colour, tuple(low.tolist()), mask)

    def circle(self, x, y, r, fill, stroke, width=1.5):
        self._draw.circle((self.LARGE * x, self.LARGE * y), self.LARGE * (r + width / 2), fill=stroke)
        self._draw.circle((self.LARGE * x, self.LARGE * y), self.LARGE * (r - width / 2), fill=fill)

    def text(self, x, y, words, colour=SOFT, align="left", size=11, bold=False):
        anchor = {"left": "lm", "right": "rm", "centre": "mm"}[align]
        self._draw.text((self.LARGE * x, self.LARGE * y), _plain(words), fill=colour, font=self._font(size), anchor=anchor,
                        stroke_width=1 if bold else 0, stroke_fill=colour)

    def text_width(self, words, size=11):
        return self._font(size).getlength(_plain(words)) / self.LARGE

    def _font(self, size):
        from PIL import ImageFont

        if size not in self._fonts:
            self._fonts[size] = ImageFont.load_default(size * self.LARGE)
        return self._fonts[size]

    def finish(self):
        from PIL import Image

        small = self._image.resize([round(v * self.LARGE / self.REDUCED) for v in (self.width, self.height)], Image.Resampling.BOX)
        out = io.BytesIO()
        small.quantize(palette=_palette(), dither=Image.Dither.NONE).save(out, "PNG", compress_level=7)
        return out.getvalue()


@cache
def _palette():
    """Our colours and their shades towards the ground: what an edge is made of. A quarter of the size and no colour is merged with another."""
    from PIL import Image, ImageColor

    light = [ImageColor.getrgb(c) for c in (GROUND, LANE, FAINT, TUBE)]      # exact only: Pillow takes near-white for white
    strong = np.array([ImageColor.getrgb(c) for c in (INK, SOFT, QUIET, LINE, GREEN, SEVERITY["warn"], SEVERITY["fail"])])
    shades = (255.0 + np.linspace(0.1, 1.0, 28)[:, None, None] * (strong - 255.0)).reshape(-1, 3)
    image = Image.new("P", (1, 1))
    image.putpalette(np.rint(np.vstack([light, shades])).astype(np.uint8).tobytes())
    return image


def _plain(words):
    """The built-in font knows Latin letters only."""
    for sign, letters in (("–", "-"), ("×", "x"), ("²", "2"), ("≥", ">="), ("≤", "<="), ("σ", "sigma")):
        words = words.replace(sign, letters)
    return words


def _dashed(points, dash):
    """(K, 2, 2) the pieces of a polyline that are drawn, for (drawn, left out) lengths."""
    lengths = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    starts = np.arange(0.0, lengths[-1], sum(dash))
    stops = np.unique(np.concatenate([lengths, starts, np.minimum(starts + dash[0], lengths[-1])]))
    at = np.column_stack([np.interp(stops, lengths, points[:, k]) for k in (0, 1)])
    drawn = (0.5 * (stops[1:] + stops[:-1])) % sum(dash) < dash[0]
    return np.stack([at[:-1], at[1:]], axis=1)[drawn]
