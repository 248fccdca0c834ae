"""One module an analysis kind: model and start state in, record with its audit out."""
