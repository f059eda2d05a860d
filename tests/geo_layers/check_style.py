#!/usr/bin/python3
# SPDX-License-Identifier: Apache-2.0
"""Checks a style in SLD 1.1 (structure of OGC 05-078r4 and 05-077r4) and the same in QML.

    check_style.py STYLE.sld STYLE.qml
"""
import sys
import xml.etree.ElementTree as tree

SLD, SE, OGC = ("{http://www.opengis.net/%s}" % n for n in ("sld", "se", "ogc"))
TESTS = {OGC + n for n in ("PropertyIsEqualTo", "PropertyIsGreaterThanOrEqualTo", "PropertyIsLessThan",
                           "PropertyIsLessThanOrEqualTo")}


def sld_rules(root):
    assert root.tag == SLD + "StyledLayerDescriptor" and root.get("version") == "1.1.0"
    layer = root.find(SLD + "NamedLayer")
    assert layer.find(SE + "Name").text
    style = layer.find(SLD + "UserStyle")
    rules = 0
    for kind in style.findall(SE + "FeatureTypeStyle"):
        for rule in kind.findall(SE + "Rule"):
            # Order of the schema: Name, Description, Filter or ElseFilter, Symbolizer.
            tags = [child.tag for child in rule]
            assert tags[:2] == [SE + "Name", SE + "Description"], tags
            assert tags[-1] in (SE + "PointSymbolizer", SE + "LineSymbolizer"), tags
            assert len(tags) == 3 or tags[2] in (OGC + "Filter", SE + "ElseFilter"), tags
            for test in (e for e in rule.iter() if e.tag.startswith(OGC + "PropertyIs")):
                assert test.tag in TESTS
                assert [c.tag for c in test] == [OGC + "PropertyName", OGC + "Literal"]
                assert test[0].text
            rules += 1
    return rules


def qml_rules(root):
    assert root.tag == "qgis"
    renderer = root.find("renderer-v2")
    assert renderer.get("type") == "RuleRenderer"
    rules = [r for r in renderer.find("rules").iter("rule") if r.get("symbol") is not None]
    symbols = {s.get("name") for s in renderer.find("symbols")}
    assert {r.get("symbol") for r in rules} == symbols
    assert len({r.get("key") for r in renderer.find("rules").iter("rule")}) >= len(rules)
    return len(rules)


def main():
    sld, qml = (tree.parse(path).getroot() for path in sys.argv[1:3])
    assert sld_rules(sld) == qml_rules(qml) > 0
    return 0


if __name__ == "__main__":
    sys.exit(main())
