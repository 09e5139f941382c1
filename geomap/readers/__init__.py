"""Files of any kind in, canonical tables of text out: values are judged later, by intake."""
