"""Text and model: the layouts, the label grammar, element facts, and the one model they share."""

if __name__ == "grammar":
    raise ImportError("this folder is installed as overlapse.grammar")
