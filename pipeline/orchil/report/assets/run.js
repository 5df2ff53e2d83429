fillStrips(document);
for (const figure of document.querySelectorAll("figure.scene")) new Scene(figure);
if (night && document.getElementById("rows")) {
  startTable();
  startCards();
  startPlot();
}
