using System.Text;

namespace Stacks.Formats.Fits;

/// <summary>The bytes of a header: cards, blank cards up to the size that was set aside, END, and the checksums.</summary>
internal static class HeaderImage
{
    /// <summary>Cards that <see cref="Build"/> adds: DATASUM, CHECKSUM and END.</summary>
    private const int OwnCards = 3;

    private const string Unset = "0000000000000000";

    /// <summary>Bytes of a header with this many cards besides those that <see cref="Build"/> adds.</summary>
    public static long BytesFor(int cards) => FitsBlock.Padded((long)(cards + OwnCards) * FitsBlock.CardBytes);

    /// <summary>Cards that a header of so many bytes has room for, besides those that <see cref="Build"/> adds.</summary>
    public static int RoomFor(long bytes) => (int)(bytes / FitsBlock.CardBytes) - OwnCards;

    /// <summary>Builds a header of exactly <paramref name="bytes"/> bytes.</summary>
    /// <param name="cards">Its cards; they fit.</param>
    /// <param name="bytes">Whole blocks.</param>
    /// <param name="dataSum">Sum of the data unit.</param>
    public static byte[] Build(IReadOnlyList<FitsCard> cards, long bytes, uint dataSum)
    {
        StringBuilder text = new((int)bytes);
        foreach (FitsCard card in cards)
            text.Append(card.Image);
        text.Append(FitsCard.Text("DATASUM", FitsChecksum.Text(dataSum), "sum of the data unit").Single().Image);
        int checksumAt = text.Length;
        text.Append(FitsCard.Text("CHECKSUM", Unset, "sum of the HDU is all ones").Single().Image);

        // END stands in the last block, blank cards before it are legal (Standard 4.0, section 4.4.2.4).
        long lastBlock = bytes - FitsBlock.Bytes;
        text.Append(' ', (int)Math.Max(0, lastBlock - text.Length));
        text.Append(FitsCard.End.Image);
        text.Append(' ', (int)(bytes - text.Length));

        byte[] header = Encoding.Latin1.GetBytes(text.ToString());
        uint sum = FitsChecksum.Add(FitsChecksum.Sum(header), dataSum);
        Encoding.ASCII.GetBytes(FitsChecksum.Encode(~sum), header.AsSpan(checksumAt + 11, Unset.Length));
        return header;
    }
}
