"""Reads the documents of documents.ts with general-purpose libraries and prints what they found, as JSON.

    python3-prov 2.0.0 (PROV-JSON), python3-pyld 2.0.3 and python3-rdflib 6.1.1 (JSON-LD), all of Debian 12

    node test/data/bag/scripts/documents.ts DIRECTORY
    /usr/bin/python3 test/data/bag/scripts/validate.py DIRECTORY CONTEXT > test/data/bag/validated.json

CONTEXT is the published RO-Crate 1.2 context, https://w3id.org/ro/crate/1.2/context, as a file. The npm package
ro-crate 3.7.2 carries it as lib/context.json (licence of the context: CC0).
"""

import collections
import hashlib
import io
import json
import sys

import prov
import prov.model
import rdflib
from pyld import __about__, jsonld

CONTEXT_URL = "https://w3id.org/ro/crate/1.2/context"
BASE = "https://example.org/bag/data/"


def sha256(data):
    return hashlib.sha256(data).hexdigest()


def validate_prov(text):
    document = prov.model.ProvDocument.deserialize(content=text, format="json")
    again = prov.model.ProvDocument.deserialize(content=document.serialize(format="json"), format="json")
    kinds = collections.Counter(type(record).__name__ for record in document.get_records())
    unified = document.unified()
    return {
        "library": "prov " + prov.__version__,
        "sha256": sha256(text.encode()),
        "records": len(document.get_records()),
        "kinds": dict(sorted(kinds.items())),
        "round trip": "equal" if document == again else "different",
        "unified records": len(unified.get_records()),
        "agents": sorted(str(agent.identifier) for agent in document.get_records(prov.model.ProvAgent)),
        "times": sum(1 for a in document.get_records(prov.model.ProvActivity) if a.get_startTime() is not None),
        "prov-n lines": len(document.get_provn().splitlines()),
    }


def terms_of(graph):
    """Every key and type that the document uses."""
    keys, types = set(), set()
    for entity in graph:
        keys.update(key for key in entity if not key.startswith("@"))
        declared = entity["@type"]
        types.update(declared if isinstance(declared, list) else [declared])
    return sorted(keys), sorted(types)


def validate_crate(text, context):
    def load(url, options=None):
        if url != CONTEXT_URL:
            raise ValueError("unexpected context " + url)
        return {"contextUrl": None, "documentUrl": url, "contentType": "application/ld+json", "document": context}

    jsonld.set_document_loader(load)
    crate = json.loads(text)
    expanded = jsonld.expand(crate, {"base": BASE})
    by_id = {entity["@id"]: entity for entity in expanded}
    lost = []
    for entity in crate["@graph"]:
        found = [e for e in expanded if e["@id"] == jsonld.prepend_base(BASE, entity["@id"])]
        properties = len([key for key in entity if not key.startswith("@")])
        has = len([key for key in found[0] if not key.startswith("@")]) if found else 0
        if properties != has:
            lost.append([entity["@id"], properties, has])
    keys, types = terms_of(crate["@graph"])
    iris = {}
    for key in keys:
        one = jsonld.expand({"@context": CONTEXT_URL, "@id": "x:y", key: "z"})
        iris[key] = [k for k in (one[0] if one else {}) if k != "@id"]
    type_iris = {}
    for name in types:
        type_iris[name] = jsonld.expand({"@context": CONTEXT_URL, "@id": "x:y", "@type": name})[0]["@type"]
    quads = jsonld.normalize(crate, {"algorithm": "URDNA2015", "format": "application/n-quads", "base": BASE})
    graph = rdflib.Graph()
    graph.parse(io.StringIO(quads), format="nt")
    schema = rdflib.Namespace("http://schema.org/")
    root = rdflib.URIRef(BASE)
    parts = set(graph.objects(root, schema.hasPart))
    files = set(graph.subjects(rdflib.RDF.type, schema.MediaObject))
    return {
        "library": "pyld " + __about__.__version__ + ", rdflib " + rdflib.__version__,
        "context": {"url": CONTEXT_URL, "version": context.get("version"), "sha256 of @context": sha256(
            json.dumps(context["@context"], sort_keys=True, separators=(",", ":"), ensure_ascii=False).encode())},
        "sha256": sha256(text.encode()),
        "entities": len(crate["@graph"]),
        "expanded entities": len(expanded),
        "entities that lost a property": lost,
        "keys": iris,
        "types": type_iris,
        "n-quads": len(quads.splitlines()),
        "urdna2015 sha256": sha256(quads.encode()),
        "triples read by rdflib": len(graph),
        "parts of the root": len(parts),
        "files that are no part": sorted(str(f) for f in files - parts),
        "parts that are no file": sorted(str(f) for f in parts - files),
        "root": sorted(key for key in by_id[BASE] if not key.startswith("@")),
    }


def main():
    directory, context_file = sys.argv[1:3]
    with open(context_file, encoding="utf-8") as file:
        context = json.load(file)
    with open(directory + "/provenance.json", encoding="utf-8") as file:
        found = {"provenance.json": validate_prov(file.read())}
    with open(directory + "/ro-crate-metadata.json", encoding="utf-8") as file:
        found["ro-crate-metadata.json"] = validate_crate(file.read(), context)
    json.dump(found, sys.stdout, indent=1, ensure_ascii=False)
    sys.stdout.write("\n")


main()
