"""Physics and judgement: the rules, the findings they give, and the formulas they rest on."""

if __name__ == "rules":
    raise ImportError("this folder is installed as overlapse.rules")
