# man.awk: awk -v name=NAME -v about=TEXT -v version=V -v only="HEADING|HEADING" -f man.awk PAGE.md...
# A page of docs/ as a manual page of section 5. Headings become sections, tables become lists of
# their first column, fenced and indented blocks stay as they are. `only`: the sections to take
# ("" : all).
function escape(text) {
    gsub(/\\/, "\\e", text)
    gsub(/-/, "\\-", text)
    return text
}
function inline(text,   out, at) {
    text = escape(text)
    gsub(/\[[^\]]*\]\([^)]*\)/, "&", text)
    while ((at = index(text, "`")) > 0) {
        out = out substr(text, 1, at - 1)
        text = substr(text, at + 1)
        at = index(text, "`")
        if (at == 0) break
        out = out "\\fB" substr(text, 1, at - 1) "\\fR"
        text = substr(text, at + 1)
    }
    text = out text
    gsub(/\*\*/, "", text)
    return text
}
function put(text) {
    if (text ~ /^[.']/) text = "\\&" text
    print text
}
function end_block() {
    if (indented) { print ".fi\n.RE"; indented = 0 }
}
BEGIN {
    printf ".TH %s 5 \"\" \"ampstead %s\" \"File Formats\"\n", toupper(escape(name)), version
    printf ".SH NAME\n%s \\- %s\n", escape(name), about
}
FNR == 1 { taken = only == "" }
/^<!--/ { next }
/^```/ {
    if (taken) print fenced ? ".fi\n.RE" : ".RS 4\n.nf"
    fenced = !fenced
    next
}
fenced { if (taken) put(escape($0)); next }
/^# / { next }
/^##+ / {
    end_block()
    heading = $0
    sub(/^#+ /, "", heading)
    if ($0 ~ /^## / && only != "") taken = index("|" only "|", "|" heading "|") > 0
    if (taken) printf "%s %s\n", ($0 ~ /^## / ? ".SH" : ".SS"), toupper(inline(heading))
    next
}
!taken { next }
/^    / {
    if (!indented) print ".RS 4\n.nf"
    indented = 1
    put(escape(substr($0, 5)))
    next
}
{ end_block() }
/^\| *-+/ { next }
/^\|/ {
    line = $0
    gsub(/\\\|/, "\001", line)
    count = split(line, cells, /\|/)
    # the row above the rule of dashes is the heading: known by its plain words
    if (cells[2] ~ /^ (statement|thing|code|status|parameter|quantity) $/) next
    print ".TP"
    gsub(/^ +| +$/, "", cells[2])
    gsub(/\001/, "|", cells[2])
    print ".B " inline(cells[2])
    text = ""
    for (k = 3; k < count; k++) {
        gsub(/^ +| +$/, "", cells[k])
        gsub(/\001/, "|", cells[k])
        if (cells[k] != "") text = text (text == "" ? "" : "; ") cells[k]
    }
    put(inline(text))
    next
}
/^- / { print ".IP \\(bu 2"; put(inline(substr($0, 3))); next }
/^$/ { print ".PP"; next }
{ sub(/^ +/, ""); put(inline($0)) }
END {
    end_block()
    print ".SH SEE ALSO\n.BR ampstead (1)"
}
