using System.Buffers.Binary;
using System.Globalization;
using System.Text;
using Stacks.Abstractions;

namespace Stacks.Formats.Fits;

/// <summary>The ledger as a binary table, a row for each frame.</summary>
internal static class LedgerTable
{
    /// <summary>EXTNAME of the ledger.</summary>
    public const string ExtensionName = "LEDGER";

    private const int DigestCharacters = 64;
    private const int NameCharacters = 32;
    private const long NoIndex = -1;

    /// <summary>Writes the table as an extension at an offset; returns the offset behind it.</summary>
    public static long WriteExtension(PartialFile output, long offset, IReadOnlyList<LedgerRow> rows, Func<int, FrameLayout> layoutOf, long version)
    {
        List<Column> columns = Columns(rows, layoutOf);
        int rowBytes = columns.Sum(column => column.Bytes);
        List<FitsCard> cards = Header(columns, rows.Count, rowBytes, version);
        long headerBytes = HeaderImage.BytesFor(cards.Count);
        DataUnit data = new(output, offset + headerBytes);
        byte[] bytes = new byte[rowBytes];
        foreach (LedgerRow row in rows)
        {
            Span<byte> rest = bytes;
            FrameLayout layout = layoutOf(row.Frame);
            foreach (Column column in columns)
            {
                column.Write(row, layout, rest[..column.Bytes]);
                rest = rest[column.Bytes..];
            }

            data.Append(bytes);
        }

        long after = data.Pad();
        output.Write(HeaderImage.Build(cards, headerBytes, data.Sum), offset);
        return after;
    }

    /// <summary>Every column is declared here once; those about place only where some frame has it.</summary>
    private static List<Column> Columns(IReadOnlyList<LedgerRow> rows, Func<int, FrameLayout> layoutOf)
    {
        // "adu" is the standard's spelling (Standard 4.0, table 5).
        string unit = rows.Count > 0 && layoutOf(rows[0].Frame).Unit is var stated && stated != "ADU" ? stated : "adu";
        List<Column> columns = [Count("FRAME", "", "frame of the stack, from 0", (row, _) => row.Frame)];
        if (rows.Any(row => layoutOf(row.Frame).Extension is not null))
            columns.Add(Name("EXTENSN", "extension of the source", layout => layout.Extension));
        if (rows.Any(row => layoutOf(row.Frame).Channel is not null))
        {
            columns.Add(Count("CHANNEL", "", "channel, from 0; -1 for none", (_, layout) => layout.Channel ?? NoIndex));
            columns.Add(Name("CHANNAME", "name of the channel", layout => layout.ChannelName));
        }

        if (rows.Any(row => layoutOf(row.Frame).Z is not null))
            columns.Add(Count("Z", "", "index along z, from 0; -1 for none", (_, layout) => layout.Z ?? NoIndex));
        if (rows.Any(row => layoutOf(row.Frame).Time is not null))
            columns.Add(Count("TIME", "", "index in time, from 0; -1 for none", (_, layout) => layout.Time ?? NoIndex));
        columns.AddRange(
        [
            Digest("SRCDIGST", "SHA-256 of source samples, little-endian", row => row.SourceDigest),
            Digest("OUTDIGST", "SHA-256 of result samples, little-endian", row => row.ResultDigest),
            Number("LEVEL", unit, "median of valid input", row => row.Level),
            Number("NOISEIN", unit, "sigma measured on the input", row => row.NoiseBefore),
            Number("NOISEOUT", unit, "sigma measured on the result", row => row.NoiseAfter),
            Count("BRIGHT", "pixel", "replaced, brighter than around", (row, _) => row.ReplacedBright),
            Count("DARK", "pixel", "replaced, darker than around", (row, _) => row.ReplacedDark),
            Count("KEPT", "pixel", "candidates kept as sources", (row, _) => row.KeptAsSource),
            Count("SATURATD", "pixel", "saturated", (row, _) => row.Saturated),
            Count("MISSING", "pixel", "missing", (row, _) => row.Missing),
            Number("FLUXIN", unit, "sum of valid input", row => row.FluxIn),
            Number("FLUXREM", unit, "sum of input minus output", row => row.FluxRemoved),
            Number("FLUXOUT", unit, "sum of valid output", row => row.FluxOut),
            Count("FLAGS", "", "remarks, see COMMENT", (row, _) => (long)row.Flags),
        ]);
        return columns;
    }

    private static List<FitsCard> Header(List<Column> columns, int rows, int rowBytes, long version)
    {
        List<FitsCard> cards =
        [
            .. FitsCard.Text("XTENSION", "BINTABLE", "binary table"),
            FitsCard.Integer("BITPIX", 8, ""),
            FitsCard.Integer("NAXIS", 2, ""),
            FitsCard.Integer("NAXIS1", rowBytes, "bytes of a row"),
            FitsCard.Integer("NAXIS2", rows, "rows, one a frame"),
            FitsCard.Integer("PCOUNT", 0, ""),
            FitsCard.Integer("GCOUNT", 1, ""),
            FitsCard.Integer("TFIELDS", columns.Count, ""),
        ];
        for (int i = 0; i < columns.Count; i++)
        {
            string number = (i + 1).ToString(CultureInfo.InvariantCulture);
            cards.AddRange(FitsCard.Text("TTYPE" + number, columns[i].Name, columns[i].Meaning));
            cards.AddRange(FitsCard.Text("TFORM" + number, columns[i].Form, ""));
            if (columns[i].Unit.Length > 0)
                cards.AddRange(FitsCard.Text("TUNIT" + number, columns[i].Unit, ""));
        }

        cards.AddRange(
        [
            .. FitsCard.Text("EXTNAME", ExtensionName, "account of every frame"),
            FitsCard.Integer("EXTVER", version, ""),
            .. FitsCard.Commentary("COMMENT", "FLAGS is the sum of:"),
        ]);
        foreach ((LedgerFlags flag, string meaning) in FlagMeanings)
            cards.AddRange(FitsCard.Commentary("COMMENT", string.Create(CultureInfo.InvariantCulture, $"{(int)flag,4} {meaning}")));
        return cards;
    }

    private static (LedgerFlags Flag, string Meaning)[] FlagMeanings { get; } =
    [
        (LedgerFlags.NoiseDisagrees, "measured noise and noise model differ by more than a factor 1.5"),
        (LedgerFlags.NoiseNotMeasurable, "the noise could not be measured"),
        (LedgerFlags.OutOfRange, "a result left the range of the type and was held at its end"),
    ];

    private static Column Count(string name, string unit, string meaning, Func<LedgerRow, FrameLayout, long> value) =>
        new(name, "1K", unit, meaning, 8, (row, layout, to) => BinaryPrimitives.WriteInt64BigEndian(to, value(row, layout)));

    private static Column Number(string name, string unit, string meaning, Func<LedgerRow, double> value) =>
        new(name, "1D", unit, meaning, 8, (row, _, to) => BinaryPrimitives.WriteDoubleBigEndian(to, value(row)));

    private static Column Digest(string name, string meaning, Func<LedgerRow, byte[]> value) =>
        new(name, "64A", "", meaning, DigestCharacters, (row, _, to) => Fill(Convert.ToHexStringLower(value(row)), to));

    private static Column Name(string name, string meaning, Func<FrameLayout, string?> value) =>
        new(name, "32A", "", meaning, NameCharacters, (_, layout, to) => Fill(value(layout) ?? "", to));

    /// <summary>ASCII, cut or filled with spaces.</summary>
    private static void Fill(string text, Span<byte> to)
    {
        to.Fill((byte)' ');
        Encoding.ASCII.GetBytes(text.AsSpan(0, Math.Min(text.Length, to.Length)), to);
    }

    private delegate void WriteCell(LedgerRow row, FrameLayout layout, Span<byte> to);

    private sealed record Column(string Name, string Form, string Unit, string Meaning, int Bytes, WriteCell Write);
}
