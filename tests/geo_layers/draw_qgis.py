#!/usr/bin/python3
# SPDX-License-Identifier: Apache-2.0
"""Opens every layer of a GeoPackage in QGIS without a screen, with the style that lies in it, and draws a map.

    QT_QPA_PLATFORM=offscreen draw_qgis.py LAYERS.gpkg MAP.png [LAYER ...]

Outside the default test run: it needs Debian's python3-qgis (some 300 MB). Says what is wrong and ends with
status 1. Layers named on the command line are drawn, the first one on top; without any, all with a place.
"""
import os
import sqlite3
import sys

from qgis.core import (QgsApplication, QgsMapRendererParallelJob, QgsMapSettings, QgsRectangle, QgsRenderContext,
                       QgsVectorLayer)
from qgis.PyQt.QtCore import QSize
from qgis.PyQt.QtGui import QColor


def styled_layers(path):
    with sqlite3.connect(path) as db:
        return [row[0] for row in db.execute("SELECT f_table_name FROM layer_styles ORDER BY id")]


def problems_of(layer, path):
    """A layer must open, have its rules, find a symbol for every row, and take its SLD as well."""
    if not layer.isValid():
        yield "does not open"
        return
    if layer.renderer().type() != "RuleRenderer":
        yield f"is drawn by {layer.renderer().type()}, not by its own rules"
        return
    renderer, context = layer.renderer(), QgsRenderContext()
    renderer.startRender(context, layer.fields())
    bare = 0
    for feature in layer.getFeatures():
        context.expressionContext().setFeature(feature)
        if feature.hasGeometry() and not renderer.willRenderFeature(feature, context):
            bare += 1
    renderer.stopRender(context)
    if bare:
        yield f"{bare} rows get no symbol"
    classes = len(renderer.legendSymbolItems())
    sld = os.path.join(os.path.dirname(path), "layers", layer.name() + ".sld")
    message, loaded = layer.clone().loadSldStyle(sld)
    if not loaded:
        yield f"its SLD does not load: {message}"
    other = layer.clone()
    other.loadSldStyle(sld)
    if len(other.renderer().legendSymbolItems()) < classes - 2:  # the two groups of the rules
        yield "its SLD has fewer classes"
    layer.loadDefaultStyle()
    if any(field.name() == "date" for field in layer.fields()) and not layer.temporalProperties().isActive():
        yield "has dates but cannot be played"


def draw(layers, file):
    settings = QgsMapSettings()
    settings.setLayers(layers)
    settings.setDestinationCrs(layers[0].crs())
    settings.setBackgroundColor(QColor("white"))
    settings.setOutputSize(QSize(1000, 700))
    extent = QgsRectangle()
    for layer in layers:
        extent.combineExtentWith(layer.extent())
    extent.scale(1.15)
    settings.setExtent(extent)
    job = QgsMapRendererParallelJob(settings)
    job.start()
    job.waitForFinished()
    image = job.renderedImage()
    image.save(file)
    white = QColor("white").rgb()
    return sum(image.pixel(x, y) != white for x in range(0, 1000, 2) for y in range(0, 700, 2))


def main():
    if len(sys.argv) < 3:
        print(__doc__)
        return 1
    path, file, chosen = sys.argv[1], sys.argv[2], sys.argv[3:]
    app = QgsApplication([], False)
    app.initQgis()
    layers = {name: QgsVectorLayer(f"{path}|layername={name}", name, "ogr") for name in styled_layers(path)}
    found = [f"{name}: {problem}" for name, layer in layers.items() for problem in problems_of(layer, path)]
    if not layers:
        found.append("no layer has a style")
    elif not draw([layers[name] for name in chosen or layers], file):
        found.append("the map is empty")
    print("\n".join(found) if found else f"{len(layers)} layers open and draw with their styles")
    del layers
    app.exitQgis()
    return 1 if found else 0


if __name__ == "__main__":
    sys.exit(main())
