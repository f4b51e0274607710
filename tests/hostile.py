"""Texts that a stranger's board may hold to make a reader, a terminal or a host obey them."""

from __future__ import annotations

import re

HOSTILE: tuple[str, ...] = (
    # terminals
    "\x1b[31mred\x1b[0m",
    "\x1b]0;title\x07",
    "\x1b]8;;http://evil.example\x1b\\link\x1b]8;;\x1b\\",
    "\x1b[2J\x1b[H",
    "\x9b31mC1 colour",
    "\x9d0;C1 title\x9c",
    "a\rforged line",
    "back\x08\x08\x08space",
    "bell\x07",
    "nul\x00byte",
    "del\x7fete",
    "\x85next line",
    # direction, invisible and stacked characters
    "user\u202egnp.exe",
    "\u2066isolate\u2069",
    "zero\u200bwidth\u200djoin",
    "\ufeffmark",
    "tag\U000e0041\U000e0042",
    "line\u2028separator\u2029paragraph",
    "Z" + "\u0300\u0301\u0302\u0303\u0304" * 8,
    "soft\u00adhyphen",
    "private\ue000use",
    "nonchar\uffff\ufdd0",
    "lone\ud800surrogate",
    # markup of a drawing library
    "[bold red]shout[/bold red]",
    "[link=http://evil.example]x[/link]",
    "[/]",
    ":smile: :warning:",
    # Markdown
    "[click](http://evil.example)",
    "![pixel](http://evil.example/x.png)",
    "<http://evil.example>",
    "http://evil.example/path?x=1",
    "www.evil.example",
    "someone@evil.example",
    "@everyone please look #1 !2 GH-3",
    "`code` ``more`` ```",
    "| a | b |\n| --- | --- |\n| 1 | 2 |",
    "# heading\n\n- item\n\n> quote",
    "**bold** __bold__ *i* _i_ ~~gone~~",
    "[ref]\n\n[ref]: http://evil.example",
    "\\`escaped\\` \\[x\\](y)",
    "---\n===",
    "1. one\n2. two",
    "&lt;b&gt; &#60;script&#62; &amp;",
    "[^1]: footnote $math$ :emoji:",
    # HTML
    "<script>alert(1)</script>",
    "<img src=x onerror=alert(1)>",
    '" onmouseover="alert(1)" x="',
    "</style><script>1</script>",
    "<!-- comment --> ]]> <![CDATA[x]]>",
    "javascript:alert(1)",
    "' onload='x",
    # hosts of builds
    "::error file=x,line=1::forged",
    "x\n::set-output name=a::b",
    "##[error]forged ##vso[task.setvariable]x",
    "%0A::warning::forged%0D",
    "::stop-commands::token",
    "a,line=1::b:c",
    # paths and spreadsheets
    "../../../../etc/passwd",
    "/etc/passwd",
    "C:\\Windows\\system32",
    "=cmd|'/c calc'!A1",
    "x" * 5000,
    "",
    " ",
)


def parsed_command(line: str) -> tuple[str, dict[str, str], str]:
    """Read a command as the documentation of hosted builds describes it."""
    match = re.fullmatch(r"::(\w+)(?: (.*?))?::(.*)", line)
    assert match is not None, line
    level, properties, message = match.groups()

    def plain(value: str, inside: bool) -> str:
        if inside:
            value = value.replace("%3A", ":").replace("%2C", ",")
        return value.replace("%0D", "\r").replace("%0A", "\n").replace("%25", "%")

    pairs = [pair.split("=", 1) for pair in (properties or "").split(",") if pair]
    return level, {name: plain(value, True) for name, value in pairs}, plain(message, False)
